import { joinUnit, number, withUnit } from "./format.js";
import { shownUnit, toShown, valueInUnit } from "./units.js";

/** How requirements and readings are put into words. */

/** What the screen says where there is no number. */
const STATE_WORDS = {
  unlimited: "unlimited",
  unbounded: "unbounded",
  absent: "absent",
  "not determinable": "not assessable",
  unstable: "unstable",
};

/**
 * A reading as it stands in a row: "42.4°", "unstable", "not assessable".
 *
 * @param {{value: number|null, state: string}|null|undefined} reading
 * @param {string} unit the measure's unit
 * @param {"rad/s"|"Hz"} shown
 */
export function readingText(reading, unit, shown) {
  if (!reading) return "–";
  return reading.state === "value" ? withUnit(reading.value, unit, shown) : STATE_WORDS[reading.state] ?? reading.state;
}

/** The same beside another one: the unit is there already. */
export function bareText(reading, unit, shown) {
  return reading.state === "value" ? number(valueInUnit(reading.value, unit, shown)) : readingText(reading, unit, shown);
}

/** Where a reading was taken: "at 4.70 rad/s", "at 0.31 s", or "". */
export function whereRead(reading, shown) {
  if (typeof reading?.at_rad_s === "number") {
    return reading.at_rad_s === 0 ? "towards zero frequency" : `at ${number(toShown(reading.at_rad_s, shown))} ${shown}`;
  }
  return typeof reading?.at_s === "number" ? `at ${number(reading.at_s)} s` : "";
}

/** The measure with what it is taken at: "loop gain at 0.50 rad/s". */
export function measureText(requirement, label, shown) {
  const name = label || requirement.measure;
  const at = (value) => trimmed(toShown(value, shown));
  if (typeof requirement.at_rad_s === "number") return `${name} at ${at(requirement.at_rad_s)} ${shown}`;
  if (requirement.over_rad_s) return `${name} from ${at(requirement.over_rad_s[0])} to ${at(requirement.over_rad_s[1])} ${shown}`;
  if (requirement.mask) return `${name} against a mask`;
  return name;
}

/** A limit with its unit, "45°" or "8 dB"; the unit can be left to the other limit beside it. */
export function limitText(value, unit, shown, withUnit = true) {
  return joinUnit(trimmed(valueInUnit(value, unit, shown)), withUnit ? shownUnit(unit, shown) : "");
}

/** Limits are round numbers that someone chose: no zeros are added to them. */
function trimmed(value) {
  const text = number(value, 4);
  return text.includes(".") && !text.includes("·") ? text.replace(/\.?0+$/, "") : text;
}

/** @param {any[]} measures the catalogue @param {string} measure */
export function measureFacts(measures, measure) {
  return measures.find((one) => one.measure === measure) ?? { measure, label: measure.replaceAll("_", " "), unit: "", what: "", needs: [] };
}

/**
 * The unit of a measure in this design: effort and load peaks carry those of the signals.
 *
 * @param {import("./store.js").Store} store @param {string} measure
 */
export function unitOf(store, measure) {
  if (measure === "peak_effort") return store.design?.signals?.effort?.unit ?? "";
  if (measure === "load_peak") return store.design?.signals?.output?.unit ?? "";
  return measureFacts(store.measures, measure).unit;
}

/** One word for how a row stands, for styles and for screen readers. */
export function standing(verdict) {
  if (!verdict) return "unread";
  if (verdict.met === null || verdict.met === undefined) return "not assessable";
  return verdict.met ? "met" : "not met";
}
