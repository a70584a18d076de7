import { el, textButton } from "./element.js";
import { choice, field, textInput } from "./field.js";
import { exact } from "./format.js";
import { numberFault, typedNumber } from "./typed_number.js";
import { fromShown, toShown } from "./units.js";

/** Where a frequency measure is judged: at one frequency, over a band, or against a mask of points. */

const KINDS = [["at_rad_s", "at one frequency"], ["over_rad_s", "over a band"], ["mask", "against a mask"]];

/**
 * @param {import("./store.js").Store} store
 * @param {() => void} changed the kind changed (a mask holds its own limits)
 */
export function requirementPlaces(store, changed) {
  const kind = choice(KINDS, "at_rad_s", { on: { change: () => { draw(); changed(); } } });
  const kindField = field("judged", kind);
  const at = textInput("", { inputmode: "decimal" });
  const low = textInput("", { inputmode: "decimal" });
  const high = textInput("", { inputmode: "decimal" });
  const side = choice([["at_most", "stay at or below the mask"], ["at_least", "stay at or above the mask"]], "at_most");
  const points = el("div", { class: "mask-points", role: "group" });
  const fields = {
    at: field("frequency", at),
    low: field("from", low),
    high: field("to", high),
    side: field("the curve must", side),
    points: field("mask points", points, { group: true, hint: "straight lines over log frequency between the points" }),
  };
  const node = el("div", { class: "places" }, kindField.node, ...Object.values(fields).map((one) => one.node));
  const unit = () => store.ui.unit;
  const typed = (input) => fromShown(typedNumber(input.value), unit());
  const shown = (value) => (value === undefined ? "" : exact(toShown(value, unit())));

  function draw() {
    fields.at.node.hidden = kind.value !== "at_rad_s";
    fields.low.node.hidden = fields.high.node.hidden = kind.value !== "over_rad_s";
    fields.side.node.hidden = fields.points.node.hidden = kind.value !== "mask";
    if (kind.value === "mask" && points.childElementCount === 0) drawPoints([[undefined, undefined], [undefined, undefined]]);
  }

  function drawPoints(list, focusAt = -1) {
    const rows = list.map(([frequency, limit], index) => pointRow(frequency, limit, index));
    points.replaceChildren(el("div", { class: "mask-point mask-head", "aria-hidden": "true" },
      el("span", { text: unit() }), el("span", { text: "limit" })), ...rows,
    textButton("+ add a point", () => drawPoints([...readPoints(), [undefined, undefined]], list.length), { class: "adds" }));
    if (focusAt >= 0) points.querySelectorAll(".mask-frequency")[focusAt]?.focus();
  }

  function pointRow(frequency, limit, index) {
    const remove = textButton("remove", () => drawPoints(readPoints().filter((_, i) => i !== index)), { "aria-label": `remove point ${index + 1}` });
    return el("div", { class: "mask-point" },
      textInput(typeof frequency === "string" ? frequency : shown(frequency), { class: "field mask-frequency", inputmode: "decimal", "aria-label": `point ${index + 1}, frequency in ${unit()}` }),
      textInput(typeof limit === "string" ? limit : limit === undefined ? "" : exact(limit), { class: "field mask-limit", inputmode: "decimal", "aria-label": `point ${index + 1}, limit` }),
      remove);
  }

  // Text that is not a number yet is kept as text, so that adding a point loses nothing.
  function readPoints() {
    return [...points.querySelectorAll(".mask-frequency")].map((input) => [input.value, input.nextElementSibling.value]);
  }

  return {
    node,
    isMask: () => kind.value === "mask",
    /** @param {object} requirement @param {"at_least"|"at_most"} usual */
    set(requirement, usual) {
      kind.value = KINDS.map(([key]) => key).find((key) => requirement[key]) ?? "at_rad_s";
      at.value = shown(requirement.at_rad_s);
      low.value = shown(requirement.over_rad_s?.[0]);
      high.value = shown(requirement.over_rad_s?.[1]);
      side.value = requirement.mask_side ?? usual;
      points.replaceChildren();
      if (requirement.mask) drawPoints(requirement.mask);
      [kindField, ...Object.values(fields)].forEach((one) => one.setFault(null));
      for (const one of [fields.at, fields.low, fields.high]) one.node.querySelector("label").textContent = `${one === fields.at ? "frequency" : one === fields.low ? "from" : "to"}, ${unit()}`;
      draw();
    },
    /** The fields of the requirement, and whether all of it could be read. */
    read() {
      Object.values(fields).forEach((one) => one.setFault(null));
      const check = (one, input) => {
        const wrong = numberFault(input.value, typedNumber(input.value));
        if (wrong) one.setFault(wrong);
        return !wrong;
      };
      if (kind.value === "at_rad_s") return { ok: check(fields.at, at), part: { at_rad_s: typed(at) } };
      if (kind.value === "over_rad_s") {
        const ok = [check(fields.low, low), check(fields.high, high)].every(Boolean);
        return { ok, part: { over_rad_s: [typed(low), typed(high)] } };
      }
      const rows = readPoints().map(([f, limit]) => [fromShown(typedNumber(f), unit()), typedNumber(limit)]);
      const bad = rows.findIndex((row) => row.some(Number.isNaN));
      if (bad >= 0) fields.points.setFault(`point ${bad + 1} needs a frequency and a limit, both numbers`);
      return { ok: bad < 0, part: { mask: rows, mask_side: side.value } };
    },
    /** The fields by the path that the server's faults use. */
    places: () => [["at_rad_s", fields.at], ["over_rad_s", fields.low], ["mask", fields.points], ["mask_side", fields.side]],
  };
}
