import { insertedAt, replacedAt, withRequirements } from "./design_edits.js";
import { el, textButton } from "./element.js";
import { choice, field, placeFaults, textInput } from "./field.js";
import { exact } from "./format.js";
import { judgedEdit } from "./judged_edit.js";
import { measurePicker } from "./measure_picker.js";
import { ask } from "./request.js";
import { requirementPlaces } from "./requirement_places.js";
import { measureFacts, unitOf } from "./requirement_words.js";
import { sheet } from "./sheet.js";
import { numberFault, typedNumberOrNone } from "./typed_number.js";
import { fromShown, shownUnit, toShown } from "./units.js";

/**
 * Add or change a requirement: what is measured, its limits, on which cases, and why.
 *
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 * @returns {{open: (index: number|null) => void}} null adds a new one
 */
export function requirementEditor(root, store) {
  const window_ = sheet(root, { title: "requirement", class: "requirement-sheet keeps-open" });
  const picker = measurePicker(measureChosen);
  const what = el("p", { class: "hint" });
  const places = requirementPlaces(store, drawForMeasure);
  const atLeast = textInput("", { inputmode: "decimal" });
  const atMost = textInput("", { inputmode: "decimal" });
  const rank = choice([["must", "must"], ["should", "should"]], "must");
  const cases = el("div", { class: "checks", role: "group" });
  const reason = el("textarea", { class: "field", rows: "2" });
  const rest = el("p", { class: "fault", role: "alert" });
  const fields = new Map([
    ["measure", field("measure", picker.input)],
    ["at_least", field("at least", atLeast)],
    ["at_most", field("at most", atMost)],
    ["cases", field("judged on", cases, { group: true })],
    ["rank", field("rank", rank, { hint: "both are judged; the rank tells the reader which may give way first" })],
    ["reason", field("reason", reason, { hint: "why the limit is what it is: a standard, a measurement, a promise" })],
  ]);
  fields.get("measure").node.querySelector("label").after(picker.node, what);
  picker.node.prepend(picker.input);
  const limits = el("div", { class: "side-by-side" }, fields.get("at_least").node, fields.get("at_most").node);
  const form = el("form", { class: "form", novalidate: true, on: { submit: keep } },
    fields.get("measure").node, places.node, limits, fields.get("cases").node, fields.get("rank").node, fields.get("reason").node, rest);
  window_.body.append(form);
  const keepButton = el("button", { type: "button", class: "strong", on: { click: () => form.requestSubmit() } });
  window_.foot.append(keepButton, textButton("cancel", () => window_.close(), { class: "quiet" }));

  let index = null;
  let facts = null;
  const inRadians = () => facts?.unit === "rad/s";
  const shown = (value) => (typeof value !== "number" ? "" : exact(inRadians() ? toShown(value, store.ui.unit) : value));

  function measureChosen(measure) {
    facts = measureFacts(store.measures, measure);
    places.set({}, facts.direction ?? "at_most");
    drawForMeasure();
    (facts.needs?.length ? places.node.querySelector("select") : facts.direction === "at_most" ? atMost : atLeast).focus();
  }

  function drawForMeasure() {
    const frequency = Boolean(facts && (facts.kind === "frequency" || facts.needs?.length));
    places.node.hidden = !frequency;
    limits.hidden = !facts || (frequency && places.isMask());
    what.textContent = facts?.what ?? "";
    const unit = facts ? shownUnit(unitOf(store, facts.measure), store.ui.unit) : "";
    for (const [side, word] of [["at_least", "at least"], ["at_most", "at most"]]) {
      fields.get(side).node.querySelector("label").textContent = unit && unit !== "1" ? `${word}, ${unit}` : word;
    }
  }

  function drawCases(requirement) {
    const names = store.design.plant_cases.map((one) => one.name);
    cases.replaceChildren(...names.map((name) => el("label", { class: "check" },
      el("input", { type: "checkbox", value: name, checked: !requirement.cases || requirement.cases.includes(name) }), name)));
  }

  function readLimit(side, input) {
    const number = typedNumberOrNone(input.value);
    fields.get(side).setFault(number === undefined ? null : numberFault(input.value, number));
    return number !== undefined && inRadians() ? fromShown(number, store.ui.unit) : number;
  }

  /** The requirement as typed, or null where something could not be read. */
  function read() {
    for (const one of fields.values()) one.setFault(null);
    rest.textContent = "";
    if (!picker.value()) {
      fields.get("measure").setFault("choose what is measured");
      return null;
    }
    const old = index === null ? {} : store.design.requirements[index];
    const requirement = { measure: picker.value() };
    let ok = true;
    if (!places.node.hidden) {
      const { ok: readable, part } = places.read();
      ok = readable;
      Object.assign(requirement, part);
    }
    if (!limits.hidden) {
      const [least, most] = [readLimit("at_least", atLeast), readLimit("at_most", atMost)];
      if (least !== undefined) requirement.at_least = least;
      if (most !== undefined) requirement.at_most = most;
      ok &&= !Number.isNaN(least) && !Number.isNaN(most);
      if (ok && least === undefined && most === undefined) {
        fields.get(facts.direction ?? "at_least").setFault("needs a limit, on this side or the other");
        ok = false;
      }
    }
    const all = [...cases.querySelectorAll("input")];
    const wanted = all.filter((box) => box.checked).map((box) => box.value);
    if (wanted.length === 0) {
      fields.get("cases").setFault("choose at least one plant case");
      ok = false;
    } else if (wanted.length < all.length) requirement.cases = wanted;
    if (rank.value === "should" || old.rank === "must") requirement.rank = rank.value;
    if (reason.value.trim()) requirement.reason = reason.value.trim();
    return ok ? requirement : null;
  }

  async function keep(event) {
    event.preventDefault();
    const requirement = read();
    if (!requirement) return form.querySelector("[aria-invalid=true]")?.focus();
    const at = index ?? (store.design.requirements ?? []).length;
    const change = (design) => withRequirements(design, (list) => (index === null ? insertedAt(list, at, requirement) : replacedAt(list, at, requirement)));
    const faults = await judgedEdit(store, `${index === null ? "add" : "change"} ${facts.label}`, change);
    if (faults.length > 0) return placeFaults(new Map([...fields, ...places.places()]), faults, `requirements[${at}]`, rest);
    window_.close(() => document.querySelector(`.requirement[data-row="${at}"] .requirement-measure`)?.focus());
  }

  async function ensureMeasures() {
    if (store.measures.length > 0) return;
    const answer = await ask("GET", "/api/measures");
    if (answer.ok) store.setCatalogue({ measures: answer.body });
    else rest.textContent = answer.errors[0].what;
  }

  async function open(which) {
    if (!store.design) return;
    index = which;
    const requirement = which === null ? {} : store.design.requirements[which];
    rest.textContent = "";
    await ensureMeasures();
    facts = requirement.measure ? measureFacts(store.measures, requirement.measure) : null;
    for (const one of fields.values()) one.setFault(null);
    picker.set(store.measures, requirement.measure ?? null);
    places.set(requirement, facts?.direction ?? "at_most");
    drawForMeasure();
    drawCases(requirement);
    atLeast.value = shown(requirement.at_least);
    atMost.value = shown(requirement.at_most);
    rank.value = requirement.rank ?? "must";
    reason.value = requirement.reason ?? "";
    keepButton.textContent = which === null ? "add requirement" : "keep";
    window_.open(which === null ? "a new requirement" : facts.label);
    picker.input.focus();
  }

  return { open };
}
