/** Conversions between data and px, and the ticks that go with them. */

import { toShown, fromShown } from "./units.js";

/**
 * @typedef {{from: number, to: number, px: (value: number) => number, value: (px: number) => number,
 *            start: number, end: number, perUnit: number}} Scale   `perUnit`: px a unit (a decade where logarithmic)
 */

/** @param {[number, number]} range log10 of both ends @param {number} start px @param {number} end px @returns {Scale} */
export function logScale([from, to], start, end) {
  const perUnit = (end - start) / (to - from);
  return {
    from, to, start, end, perUnit,
    px: (value) => start + (Math.log10(value) - from) * perUnit,
    value: (px) => 10 ** (from + (px - start) / perUnit),
  };
}

/** @param {[number, number]} range @param {number} start px of the first end @param {number} end px @returns {Scale} */
export function linearScale([from, to], start, end) {
  const perUnit = (end - start) / (to - from);
  return {
    from, to, start, end, perUnit,
    px: (value) => start + (value - from) * perUnit,
    value: (px) => from + (px - start) / perUnit,
  };
}

/** Ticks on a frequency axis, in rad/s; their texts are in the unit shown. Fewer a decade where decades are many.
 *  @param {[number, number]} range log10 of rad/s @param {import("./units.js").FrequencyUnit} unit */
export function frequencyTicks([from, to], unit) {
  const low = toShown(10 ** from, unit);
  const high = toShown(10 ** to, unit);
  const decades = Math.log10(high / low);
  if (decades < 0.6) return linearTicks(low, high, 6).map((shown) => ({ rad_s: fromShown(shown, unit), shown, major: true }));
  const marks = decades > 5.5 ? [1] : decades > 1.6 ? [1, 3] : [1, 2, 5];
  const ticks = [];
  for (let power = Math.floor(Math.log10(low)); power <= Math.ceil(Math.log10(high)); power += 1) {
    for (const mark of marks) {
      const shown = mark * 10 ** power;
      if (shown >= low * 0.9999 && shown <= high * 1.0001) ticks.push({ rad_s: fromShown(shown, unit), shown, major: mark === 1 });
    }
  }
  return ticks;
}

/** Round values between two ends, about `count` of them. @param {number} low @param {number} high
 *  @param {number} count @returns {number[]} */
export function linearTicks(low, high, count) {
  const step = niceStep((high - low) / count);
  const ticks = [];
  for (let index = Math.ceil(low / step - 1e-9); index * step <= high + step * 1e-9; index += 1) {
    ticks.push(Number((index * step).toPrecision(12)));
  }
  return ticks;
}

/** The unit in which a stretch of time reads best. @param {number} span_s */
export function timeUnit(span_s) {
  if (span_s >= 0.5) return { text: "s", seconds: 1 };
  return span_s >= 0.5e-3 ? { text: "ms", seconds: 1e-3 } : { text: "µs", seconds: 1e-6 };
}

/** 1, 2, 2.5 or 5 times a power of ten, at least `rough`. @param {number} rough */
function niceStep(rough) {
  const power = 10 ** Math.floor(Math.log10(rough));
  for (const mark of [1, 2, 2.5, 5]) if (mark * power >= rough * 0.9999) return mark * power;
  return 10 * power;
}
