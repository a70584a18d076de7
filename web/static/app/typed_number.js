import { parse } from "./format.js";

/**
 * Read a number as an engineer types it: 1e3, -0.5, a typographic minus, one decimal comma.
 *
 * @param {string} text
 * @returns {number} NaN where it is not a finite number
 */
export function typedNumber(text) {
  const number = parse(text);
  return Number.isFinite(number) ? number : NaN;
}

/**
 * The same for a field that may stay empty.
 *
 * @param {string} text
 * @returns {number|undefined} undefined when empty, NaN where it is not a number
 */
export const typedNumberOrNone = (text) => (text.trim() === "" ? undefined : typedNumber(text));

/**
 * What is wrong with a typed number, or null.
 *
 * @param {string} text
 * @param {number|undefined} number as read by the functions above
 */
export function numberFault(text, number) {
  if (!Number.isNaN(number)) return null;
  return text.trim() === "" ? "needs a number" : `“${text.trim()}” is not a number; write it like 12.5 or 3e-4`;
}
