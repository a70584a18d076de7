/** How numbers are written on the screen: significant digits, a true minus, no noise. */

import { shownUnit, toShown, valueInUnit } from "./units.js";

const MINUS = "\u2212";
const THIN_SPACE = "\u202f";


/** `digits` significant digits; powers of ten outside 1e-4…1e6. @param {number} value @param {number} [digits] */
export function number(value, digits = 3) {
  if (!Number.isFinite(value)) return Number.isNaN(value) ? "?" : value > 0 ? "∞" : `${MINUS}∞`;
  if (value === 0) return "0";
  const size = Math.abs(value);
  if (size < 1e-4 || size >= 1e6) return trueMinus(powerOfTen(value, digits));
  const places = digits - 1 - Math.floor(Math.log10(size));
  if (places < 0) return grouped(String(Number(value.toPrecision(digits))));
  return grouped(value.toFixed(Math.min(places, 12)));
}

/** The number as one would type it: all its digits, up to 12, no padding. @param {number} value */
export function exact(value) {
  return trueMinus(String(Number(value.toPrecision(12))));
}

/** What was typed, back to a number: accepts a true minus, a decimal comma, spaces. NaN when it is none.
 *  @param {string} text */
export function parse(text) {
  const plain = text.trim().replaceAll(MINUS, "-").replaceAll(/[\s\u202f\u00a0]/g, "").replace(/^([^.]*),([^.]*)$/, "$1.$2");
  return plain === "" ? NaN : Number(plain);
}

/** With its sign always shown: "+2.1", "−0.4". @param {number} value @param {number} [digits] */
export function signed(value, digits = 2) {
  const text = number(value, digits);
  return value > 0 ? `+${text}` : text;
}

/** "9.50 rad/s" or "1.51 Hz". @param {number} rad_s @param {import("./units.js").FrequencyUnit} unit
 *  @param {number} [digits] */
export function frequency(rad_s, unit, digits = 3) {
  return `${number(toShown(rad_s, unit), digits)} ${unit}`;
}

/** A value with the unit of its measure: "42.4°", "9.7 dB", "1.62". @param {number} value @param {string} unit
 *  @param {import("./units.js").FrequencyUnit} shown @param {number} [digits] */
export function withUnit(value, unit, shown, digits = 3) {
  return joinUnit(number(valueInUnit(value, unit, shown), digits), shownUnit(unit, shown));
}

/** The degree sign sits on the number, every other unit after a space. @param {string} text @param {string} unit */
export function joinUnit(text, unit) {
  if (!unit || unit === "1") return text;
  return unit === "°" || unit === "deg" || unit === "degrees" ? `${text}°` : `${text} ${unit}`;
}

/** Short tick text for an axis: 0.015, 1.2, 30 000, 10⁶, 5·10⁻⁷. @param {number} value */
export function tick(value) {
  const short = Number(value.toPrecision(6));
  const size = Math.abs(short);
  if (short !== 0 && (size < 1e-4 || size >= 1e6)) return trueMinus(powerOfTen(short, 3).replace(/\.?0+·/, "·")).replace(/^(−?)1·/, "$1");
  return grouped(String(short));
}

function powerOfTen(/** @type {number} */ value, /** @type {number} */ digits) {
  const [head, power] = value.toExponential(digits - 1).split("e");
  return `${head}·10${superscript(Number(power))}`;
}

function superscript(/** @type {number} */ power) {
  const digits = "⁰¹²³⁴⁵⁶⁷⁸⁹";
  return (power < 0 ? "⁻" : "") + [...String(Math.abs(power))].map((digit) => digits[Number(digit)]).join("");
}

/** Digits in threes from 10 000 on, with a thin space that does not break. */
function grouped(/** @type {string} */ text) {
  const [whole, part] = text.split(".");
  const spaced = whole.replace("-", "").length > 4 ? whole.replace(/\B(?=(\d{3})+$)/g, THIN_SPACE) : whole;
  return trueMinus(part === undefined ? spaced : `${spaced}.${part}`);
}

function trueMinus(/** @type {string} */ text) {
  return text.replace("-", MINUS);
}

