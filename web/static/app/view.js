/** Which stretch of the axes is shown: fitted to the design, or chosen by wheel and box, with a way back. */

import { bandOf, curveOf, extent } from "./envelope.js";
import { cornersOf } from "./corners.js";

const DEEPEST_BACK = 30;

/** A range with memory. `fitted` is null until there is something to fit. */
export class View {
  /** @type {[number, number] | null} */ fitted = null;
  /** @type {[number, number] | null} */ chosen = null;
  /** @type {([number, number] | null)[]} */ #before = [];

  get range() { return this.chosen ?? this.fitted; }
  get canGoBack() { return this.#before.length > 0; }

  /** @param {[number, number]} range @param {boolean} [remember] a wheel turn is one step, not one a notch */
  choose(range, remember = true) {
    if (remember) this.#remember();
    this.chosen = range;
  }

  fit() {
    if (!this.chosen) return;
    this.#remember();
    this.chosen = null;
  }

  back() {
    this.chosen = this.#before.pop() ?? null;
  }

  forget() {
    this.#before = [];
    this.chosen = null;
  }

  #remember() {
    this.#before.push(this.chosen);
    if (this.#before.length > DEEPEST_BACK) this.#before.shift();
  }
}

/** Decades that hold everything a hand or a reading points at. @param {any} design @param {any} assessment
 *  @param {Float32Array} omega_rad_s @returns {[number, number]} log10 of rad/s */
export function fittedFrequencies(design, assessment, omega_rad_s) {
  const points = placesOf(design, assessment).filter((place) => place > 0 && Number.isFinite(place));
  const first = omega_rad_s[0];
  const last = omega_rad_s[omega_rad_s.length - 1];
  if (points.length === 0) return [Math.log10(first), Math.log10(last)];
  let low = Math.log10(Math.min(...points)) - 0.7;
  let high = Math.log10(Math.max(...points)) + 0.55;
  const missing = 2.6 - (high - low);
  if (missing > 0) {
    low -= missing / 2;
    high += missing / 2;
  }
  const range = [Math.max(Math.log10(first), roundedDown(low)), Math.min(Math.log10(last), roundedUp(high))];
  return range[1] - range[0] > 0.2 ? [range[0], range[1]] : [Math.log10(first), Math.log10(last)];
}

/** @returns {number[]} */
function placesOf(/** @type {any} */ design, /** @type {any} */ assessment) {
  const corners = cornersOf(design).map((corner) => corner.rad_s);
  const crossovers = assessment.cases.flatMap((/** @type {any} */ one) => one.gain_crossovers.map((/** @type {any} */ at) => at.rad_s));
  const rows = assessment.requirements.flatMap((/** @type {any} */ row) => [row.reading?.at_rad_s, row.at_rad_s, ...(row.over_rad_s ?? [])]);
  const margins = assessment.cases.map((/** @type {any} */ one) => one.readings.gain_margin_db?.at_rad_s);
  const near = crossovers[0] ?? corners[0] ?? 1;
  // A reading four decades off the crossover (a limit at high frequency, say) must not squeeze the rest.
  const close = (/** @type {number} */ place) => place > near * 1e-4 && place < near * 1e4;
  return [...corners, ...crossovers, ...[...rows, ...margins].filter((place) => typeof place === "number" && close(place))];
}

const STOPS = [0, Math.log10(2), Math.log10(3), Math.log10(5), 1];

function roundedDown(/** @type {number} */ exponent) {
  const whole = Math.floor(exponent);
  return whole + Math.max(...STOPS.filter((stop) => stop <= exponent - whole + 1e-9));
}

function roundedUp(/** @type {number} */ exponent) {
  const whole = Math.floor(exponent);
  return whole + Math.min(...STOPS.filter((stop) => stop >= exponent - whole - 1e-9));
}

/** Range of the gain axis in dB: the nominal in full where that is sensible, 0 dB always in sight.
 *  @param {any} arrays @param {[number, number]} range @returns {[number, number]} */
export function fittedGain(arrays, range) {
  const omega = arrays.omega_rad_s.data;
  const [low, high] = extent(omega, [curveOf(arrays.magnitude_db, 0)], 10 ** range[0], 10 ** range[1]);
  if (!Number.isFinite(low)) return [-60, 60];
  const top = Math.min(120, Math.max(20, Math.ceil((high + 4) / 20) * 20));
  const bottom = Math.max(-100, Math.min(-20, Math.floor((low - 4) / 20) * 20));
  return [Math.max(bottom, top - 180), top];
}

/** Range of the phase axis in degrees. Dead time turns without end: what lies far below the crossovers is cut.
 *  @param {any} arrays @param {[number, number]} range @param {number} lastCrossover_rad_s
 *  @returns {[number, number]} */
export function fittedPhase(arrays, range, lastCrossover_rad_s) {
  const omega = arrays.omega_rad_s.data;
  const { low: lows, high: highs } = bandOf(arrays.phase_deg, Array(arrays.phase_deg.shape[0]).fill(true));
  const [low, high] = extent(omega, [lows, highs], 10 ** range[0], 10 ** range[1]);
  if (!Number.isFinite(low)) return [-270, -90];
  const [needed] = extent(omega, [curveOf(arrays.phase_deg, 0)], 10 ** range[0], Math.min(10 ** range[1], 3 * lastCrossover_rad_s || Infinity));
  const top = Math.ceil((high + 8) / 30) * 30;
  const floor = Math.min(Number.isFinite(needed) ? needed - 60 : low, top - 330);
  const bottom = Math.floor((Math.max(low, floor) - 8) / 30) * 30;
  return [Math.min(bottom, top - 90, keepsHalfTurn(bottom, top)), top];
}

// With −180° just out of sight the margin could not be read: take it in.
function keepsHalfTurn(/** @type {number} */ bottom, /** @type {number} */ top) {
  return bottom > -180 && bottom - 60 <= -180 && top > -180 ? -195 : bottom;
}

/** Range of a response axis: zero and the stable cases in sight. @param {Float32Array} time_s @param {any} array
 *  @param {boolean[]} taken @param {[number, number]} range @param {number[]} [also] values to keep in sight if near
 *  @returns {[number, number]} */
export function fittedResponse(time_s, array, taken, range, also = []) {
  const { low, high } = bandOf(array, taken);
  let [least, most] = extent(time_s, [low, high], range[0], range[1]);
  if (!Number.isFinite(least)) [least, most] = [0, 1];
  least = Math.min(0, least);
  most = Math.max(0, most);
  const span = most - least || 1;
  // The nominal is shown even where it is unstable and grows: as much of it as does not flatten the rest.
  const nominal = extent(time_s, [curveOf(array, 0)], range[0], range[1]);
  least = Math.min(least, Math.max(nominal[0], least - span));
  most = Math.max(most, Math.min(nominal[1], most + span));
  for (const value of also) {
    if (value > most && value < most + span) most = value;
    if (value < least && value > least - span) least = value;
  }
  const room = 0.07 * (most - least || 1);
  const matters = (/** @type {number} */ value) => Math.abs(value) > 0.015 * (most - least);
  return [matters(least) ? least - room : 0, matters(most) || least === 0 ? most + room : 0];
}

/** How much of the time axis is worth showing: until every stable response has come to rest, and a little more.
 *  @param {Float32Array} time_s @param {any[]} arrays responses that come to rest @param {boolean[]} taken */
export function fittedTime(time_s, arrays, taken) {
  const whole = time_s[time_s.length - 1];
  const rests = arrays.flatMap((array) => taken.map((counts, index) => (counts ? restOf(time_s, curveOf(array, index)) : 0)));
  return Math.min(whole, Math.max(whole / 50, 1.25 * Math.max(...rests)));
}

/** Last time at which a curve is 3 % of its own span away from where it ends. */
function restOf(/** @type {Float32Array} */ time_s, /** @type {Float32Array} */ ys) {
  const [low, high] = extent(time_s, [ys], -Infinity, Infinity);
  const end = ys[ys.length - 1];
  const near = 0.03 * (high - low);
  let at = ys.length - 1;
  while (at > 0 && Math.abs(ys[at] - end) <= near) at -= 1;
  return end === end ? time_s[at] : time_s[time_s.length - 1];
}

/** The old range while the new one would change it little: axes that jump at every release tire the eye.
 *  @param {[number, number] | null} old @param {[number, number]} wanted @returns {[number, number]} */
export function steady(old, wanted) {
  if (!old) return wanted;
  const holds = old[0] <= wanted[0] && old[1] >= wanted[1];
  return holds && (wanted[1] - wanted[0]) > 0.55 * (old[1] - old[0]) ? old : wanted;
}
