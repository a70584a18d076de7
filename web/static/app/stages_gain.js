import { withGain } from "./design_edits.js";
import { el, setText } from "./element.js";
import { exactNumber } from "./exact_number.js";
import { number } from "./format.js";
import { judgedEdit } from "./judged_edit.js";
import { toShown } from "./units.js";

/** Tried in this order: the first that is a number on the nominal case says how stiff the loop is at rest. */
const CONSTANTS = [
  ["position_error_constant", "a position constant"],
  ["velocity_error_constant", "a velocity constant"],
  ["acceleration_error_constant", "an acceleration constant"],
];

/**
 * The gain as the first sentence of the drawer.
 *
 * @param {import("./store.js").Store} store
 */
export function gainRow(store) {
  const gain = exactNumber({
    name: "gain of the compensator",
    show: (value) => number(value),
    async keep(value) {
      const faults = await judgedEdit(store, "gain", (design) => withGain(design, value));
      return faults[0]?.what ?? null;
    },
  });
  const words = el("span");
  return {
    node: el("li", { class: "stage-row gain-row" }, el("span", { class: "grip-space" }),
      el("span", { class: "stage-sentence" }, "gain ", gain.node, words)),
    update() {
      if (!store.design) return;
      gain.update(store.design.compensator.gain);
      setText(words, gainWords(store.lastGood?.assessment.cases ?? [], store.ui.unit));
    },
  };
}

function gainWords(cases, shown) {
  if (cases.length === 0) return "";
  const crossover = span(cases, "crossover_rad_s", (value) => toShown(value, shown));
  const found = CONSTANTS.find(([measure]) => cases[0].readings[measure]?.state === "value");
  const constant = found && span(cases, found[0], (value) => value);
  return [crossover ? ` gives crossover ${crossover} ${shown}` : " gives no crossover", constant ? ` and ${found[1]} of ${constant}` : ""].join("");
}

function span(cases, measure, scale) {
  const values = cases.map((one) => one.readings[measure]).filter((one) => one?.state === "value").map((one) => scale(one.value));
  if (values.length === 0) return "";
  const [low, high] = [number(Math.min(...values)), number(Math.max(...values))];
  return low === high ? low : `${low} to ${high}`;
}
