/** What the three response plots show, as plain data. */

import { bandOf, curveOf } from "./envelope.js";
import { tick } from "./format.js";
import { markedRow } from "./marked.js";
import { linearTicks, timeUnit } from "./scales.js";

/** @typedef {import("./loop_picture.js").Curve} Curve */
/** @typedef {"command" | "load" | "effort"} ResponseName */

/** @type {ResponseName[]} */
export const RESPONSES = ["command", "load", "effort"];

/** Cases whose response means something next to the others. @param {any} assessment @returns {boolean[]} */
export function stableCases(assessment) {
  const stable = assessment.cases.map((/** @type {any} */ one) => one.stable);
  return stable.some(Boolean) ? stable : stable.map(() => true);
}

/** @param {import("./store.js").Store} store @param {import("./geometry.js").ResponseGeometry} geometry
 *  @param {{time: [number, number], values: [number, number][]}} ranges @returns {import("./loop_picture.js").Picture} */
export function responsePicture(store, geometry, ranges) {
  const { width, height, left, right, plots } = geometry;
  const unit = timeUnit(ranges.time[1]);
  const room = (24 / (right - left)) * (ranges.time[1] - ranges.time[0]);
  const xTicks = linearTicks(...ranges.time, Math.max(3, Math.round((right - left) / 64)))
    // The end of the axis belongs to the unit.
    .map((at) => ({ at, text: at > ranges.time[1] - room ? "" : tick(at / unit.seconds) }));
  return {
    width, height, left, right, logarithmic: false,
    plots: RESPONSES.map((name, index) => ({
      ...plots[index], x: ranges.time, y: ranges.values[index], xTicks, lines: [0],
      yTicks: linearTicks(...ranges.values[index], Math.max(2, Math.round((plots[index].bottom - plots[index].top) / 34))).map((at) => ({ at, text: tick(at) })),
      curves: [...(name === "effort" ? limitCurves(store, ranges.time) : []), ...curvesFor(store, name)],
    })),
  };
}

function curvesFor(/** @type {import("./store.js").Store} */ store, /** @type {ResponseName} */ name) {
  const { assessment, arrays } = /** @type {any} */ (store.lastGood);
  const { [name]: array, time_s: { data: xs } } = arrays;
  const curves = /** @type {Curve[]} */ ([]);
  if (array.shape[0] > 1) curves.push({ kind: "band", xs, ...bandOf(array, stableCases(assessment)) });
  const reference = store.pinned?.frame?.arrays;
  if (reference) curves.push({ kind: "pinned", xs: reference.time_s.data, ys: curveOf(reference[name], 0) });
  const marked = markedRow(store);
  if (marked && marked.caseIndex > 0) curves.push({ kind: "worst", xs, ys: curveOf(array, marked.caseIndex) });
  curves.push({ kind: "nominal", xs, ys: curveOf(array, 0) });
  return curves;
}

/** @returns {Curve[]} */
function limitCurves(/** @type {import("./store.js").Store} */ store, /** @type {[number, number]} */ time) {
  return actuatorLimits(store.design).map((limit) => ({ kind: "limit", xs: time, ys: [limit, limit] }));
}

/** @param {any} design @returns {number[]} */
export function actuatorLimits(design) {
  return [design?.actuator?.low, design?.actuator?.high].filter((limit) => typeof limit === "number");
}
