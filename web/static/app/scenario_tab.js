import { withField } from "./design_edits.js";
import { el } from "./element.js";
import { choice, field, textInput } from "./field.js";
import { exact } from "./format.js";
import { judgedEdit } from "./judged_edit.js";
import { numberFault, typedNumberOrNone } from "./typed_number.js";

/** The quiet facts around the loop: what is commanded, what loads it, what the signals are called, what the actuator can do. */

const text = (path, label, extra = {}) => ({ path, label, kind: "text", ...extra });
const amount = (path, label, extra = {}) => ({ path, label, kind: "number", ...extra });

const GROUPS = [
  ["command", [
    { path: "scenario.command.shape", label: "shape", kind: "choice", options: [["step", "step"], ["ramp", "ramp"]] },
    amount("scenario.command.amplitude", "amplitude", { fallback: 1, hint: "height of the step, or slope of the ramp" }),
    text("signals.command.name", "name"), text("signals.command.unit", "unit"),
  ]],
  ["load and output", [
    amount("scenario.load.amplitude", "step of the load", { fallback: 1, hint: "enters at the plant input" }),
    text("signals.output.name", "name of the output"), text("signals.output.unit", "unit of the output"),
  ]],
  ["actuator", [
    text("signals.effort.name", "name of the effort"), text("signals.effort.unit", "unit of the effort"),
    amount("actuator.low", "lowest effort"), amount("actuator.high", "highest effort"), amount("actuator.rate", "fastest change, per second"),
  ]],
  ["plots and notes", [
    amount("scenario.horizon_s", "responses shown for, s", { hint: "left empty: until they have settled" }),
    { path: "notes", label: "notes", kind: "area" },
  ]],
];

/**
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 * @returns {import("./drawer.js").Tab}
 */
export function scenarioTab(root, store) {
  const entries = GROUPS.map(([title, parts]) => ({ title, entries: parts.map((part) => entryOf(store, part)) }));
  root.append(el("div", { class: "scenario" }, ...entries.map(({ title, entries: list }) =>
    el("section", { class: "scenario-group" }, el("h3", { text: title }), ...list.map((entry) => entry.field.node)))));
  const all = entries.flatMap(({ entries: list }) => list);
  return {
    draw() {
      if (store.design) all.forEach((entry) => entry.draw());
    },
  };
}

function controlOf(part) {
  if (part.kind === "choice") return choice(part.options, part.options[0][0]);
  if (part.kind === "area") return el("textarea", { class: "field", rows: "3" });
  return textInput("", part.kind === "number" ? { inputmode: "decimal" } : {});
}

function entryOf(store, part) {
  const control = controlOf(part);
  const one = field(part.label, control, { hint: part.hint });
  const steps = part.path.split(".");
  let shown;

  const written = () => {
    const value = steps.reduce((object, name) => object?.[name], store.design) ?? part.fallback;
    return value === undefined ? (part.kind === "choice" ? part.options[0][0] : "") : typeof value === "number" ? exact(value) : value;
  };

  async function keep() {
    if (control.value === shown) return one.setFault(null);
    const value = part.kind === "number" ? typedNumberOrNone(control.value) : control.value === "" ? undefined : control.value;
    const wrong = typeof value === "number" ? numberFault(control.value, value) : null;
    if (wrong) return one.setFault(wrong);
    const faults = await judgedEdit(store, part.label, (design) => withPath(design, steps, value));
    return one.setFault(faults[0]?.what ?? null);
  }

  control.addEventListener("change", keep);
  control.addEventListener("keydown", (event) => {
    if (event.key !== "Escape") return;
    control.value = shown;
    one.setFault(null);
  });
  return {
    field: one,
    draw() {
      const now = written();
      if (now === shown && one.fault() === null) return;
      if (now === shown && control === document.activeElement) return;
      if (now === shown) return;
      shown = now;
      control.value = now;
      one.setFault(null);
    },
  };
}

/** The object with the value at a path; empty objects on the way are left out, so a design does not grow by a look. */
function withPath(object, [first, ...rest], value) {
  if (rest.length === 0) return withField(object, first, value);
  const inner = withPath(object[first] ?? {}, rest, value);
  return withField(object, first, Object.keys(inner).length === 0 ? undefined : inner);
}
