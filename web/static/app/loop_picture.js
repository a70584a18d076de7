/** What the loop chart shows, as plain data: axes, ticks and curves. Plotly and the live layer both draw this. */

import { bandOf, curveOf } from "./envelope.js";
import { markedRow } from "./marked.js";
import { tick } from "./format.js";
import { frequencyTicks } from "./scales.js";

/**
 * @typedef {{kind: "band" | "nominal" | "worst" | "pinned" | "limit", xs: ArrayLike<number>,
 *            ys?: ArrayLike<number>, low?: Float32Array, high?: Float32Array}} Curve
 * @typedef {{at: number, text: string}} Tick
 * @typedef {{top: number, bottom: number, x: [number, number], y: [number, number], xTicks: Tick[], yTicks: Tick[],
 *            lines: number[], curves: Curve[]}} Plot
 * @typedef {{width: number, height: number, left: number, right: number, logarithmic: boolean, plots: Plot[]}} Picture
 */

/** @param {import("./store.js").Store} store @param {import("./geometry.js").Geometry} geometry
 *  @param {{x: [number, number], gain: [number, number], phase: [number, number]}} ranges @returns {Picture} */
export function loopPicture(store, geometry, ranges) {
  const { width, figureHeight, left, right, gain, phase } = geometry;
  const xTicks = frequencyTicks(ranges.x, store.ui.unit).map((tick) => ({ at: tick.rad_s, text: "" }));
  const half = [-900, -540, -180, 180, 540].filter((line) => line > ranges.phase[0] && line < ranges.phase[1]);
  return {
    width, height: figureHeight, left, right, logarithmic: true,
    plots: [
      { ...gain, x: ranges.x, y: ranges.gain, xTicks, yTicks: ticksEvery(ranges.gain, gain, [10, 20, 40]), lines: [0], curves: curvesFor(store, "magnitude_db") },
      { ...phase, x: ranges.x, y: ranges.phase, xTicks, yTicks: ticksEvery(ranges.phase, phase, [15, 30, 45, 90, 180]), lines: half, curves: curvesFor(store, "phase_deg") },
    ],
  };
}

/** Pinned below, then the band, the worst case and the nominal on top. @param {import("./store.js").Store} store
 *  @param {"magnitude_db" | "phase_deg"} name @returns {Curve[]} */
export function curvesFor(store, name) {
  const frame = store.lastGood;
  if (!frame?.arrays) return [];
  const curves = /** @type {Curve[]} */ ([]);
  const { [name]: array, omega_rad_s: { data: xs } } = frame.arrays;
  if (array.shape[0] > 1) curves.push({ kind: "band", xs, ...bandOf(array, Array(array.shape[0]).fill(true)) });
  const reference = store.pinned?.frame?.arrays;
  if (reference) curves.push({ kind: "pinned", xs: reference.omega_rad_s.data, ys: curveOf(reference[name], 0) });
  const marked = markedRow(store);
  if (marked && marked.caseIndex > 0) curves.push({ kind: "worst", xs, ys: curveOf(array, marked.caseIndex) });
  curves.push({ kind: "nominal", xs, ys: curveOf(array, 0) });
  return curves;
}

/** The first step that leaves the labels room. @returns {Tick[]} */
function ticksEvery(/** @type {[number, number]} */ [low, high], /** @type {{top: number, bottom: number}} */ span,
  /** @type {number[]} */ steps) {
  const room = (span.bottom - span.top) / 24;
  const step = steps.find((one) => (high - low) / one <= room) ?? steps[steps.length - 1];
  const first = Math.ceil(low / step - 1e-9);
  return Array.from({ length: Math.floor(high / step + 1e-9) - first + 1 }, (_, index) => (first + index) * step)
    .map((at) => ({ at, text: tick(at) }));
}
