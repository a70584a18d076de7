import { exact, number } from "./format.js";
import { typedNumber } from "./typed_number.js";

/**
 * Lists of numbers and roots as an engineer types them. A list that cannot be read says which entry is wrong.
 *
 * @template T
 * @typedef {{ok: true, value: T} | {ok: false, what: string}} Typed<T>
 */

/**
 * Numbers separated by spaces, commas or semicolons: "1 2 900 0".
 *
 * @param {string} text @returns {Typed<number[]>}
 */
export function typedNumbers(text) {
  const words = text.split(/[\s,;]+/).filter(Boolean);
  const value = words.map(typedNumber);
  const bad = value.findIndex(Number.isNaN);
  return bad < 0 ? { ok: true, value } : { ok: false, what: `entry ${bad + 1}, “${words[bad]}”, is not a number` };
}

/**
 * A matrix, a row a line: "0 1\n-900 -2".
 *
 * @param {string} text @returns {Typed<number[][]>}
 */
export function typedMatrix(text) {
  const lines = text.split(/[\n;]+/).map((line) => line.trim()).filter(Boolean);
  const value = [];
  for (const [index, line] of lines.entries()) {
    const row = typedNumbers(line);
    if (!row.ok) return { ok: false, what: `row ${index + 1}, ${row.what}` };
    value.push(row.value);
  }
  return { ok: true, value };
}

/**
 * Zeros or poles: real ones as numbers, pairs as "-1 ± 30j" (or "-1 +- 30j"), single complex ones as "-1 + 30j".
 * Separated by commas, semicolons or lines.
 *
 * @param {string} text @returns {Typed<(number|[number, number])[]>}
 */
export function typedRoots(text) {
  const entries = text.split(/[,;\n]+/).map((entry) => entry.trim()).filter(Boolean);
  const value = [];
  for (const [index, entry] of entries.entries()) {
    const roots = rootsOf(entry);
    if (!roots) return { ok: false, what: `entry ${index + 1}, “${entry}”, is not a root; write −40 or −1 ± 30j` };
    value.push(...roots);
  }
  return { ok: true, value };
}

const PAIR = /^(.*?)(±|\+-|\+\/-)(.+)[ij]$/;
const SINGLE = /^(.*[^e+-])?([+-])([^+-]*(?:e[+-]?\d+)?)[ij]$/;

function rootsOf(entry) {
  const plain = entry.replace(/[−–]/g, "-").replace(/\*/g, "");
  if (!/[ij]/i.test(plain)) {
    const reals = plain.split(/\s+/).map(typedNumber);
    return reals.some(Number.isNaN) ? null : reals;
  }
  const dense = plain.replace(/\s+/g, "").toLowerCase();
  const pair = PAIR.exec(dense);
  if (pair) {
    const [re, im] = [pair[1] === "" ? 0 : typedNumber(pair[1]), typedNumber(pair[3])];
    return Number.isNaN(re) || Number.isNaN(im) ? null : [[re, im], [re, -im]];
  }
  const single = SINGLE.exec(/^[+-]/.test(dense) ? dense : `+${dense}`);
  if (!single) return null;
  const [re, im] = [!single[1] ? 0 : typedNumber(single[1]), typedNumber(single[3] || "1")];
  return Number.isNaN(re) || Number.isNaN(im) ? null : [[re, single[2] === "-" ? -im : im]];
}

/** Roots as text, pairs joined. @param {(number|[number, number])[]} roots @param {(value: number) => string} write */
export function rootsText(roots, write = exact) {
  return rootWords(roots, write).join(", ");
}

/** The same as a list of words, to be counted or set one by one. */
export function rootWords(roots, write = (value) => number(value, 4)) {
  const left = roots.map((root) => (Array.isArray(root) ? root : [root, 0]));
  const words = [];
  while (left.length > 0) {
    const [re, im] = left.shift();
    if (im === 0) {
      words.push(write(re));
      continue;
    }
    const mate = left.findIndex((other) => other[0] === re && other[1] === -im);
    if (mate >= 0) left.splice(mate, 1);
    const sign = mate >= 0 ? "±" : im < 0 ? "−" : "+";
    const front = re === 0 ? (sign === "+" ? "" : sign) : `${write(re)} ${sign} `;
    words.push(`${front}${write(Math.abs(im))}j`);
  }
  return words;
}

/** A place inside a list or matrix as words: "[1][0]" is "row 2, column 1", "[2]" is "entry 3". */
export function placeWords(path) {
  const [first, second] = [...path.matchAll(/\[(\d+)\]/g)].map((match) => Number(match[1]) + 1);
  if (first === undefined) return path.replace(/^\./, "");
  return second === undefined ? `entry ${first}` : `row ${first}, column ${second}`;
}
