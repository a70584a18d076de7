/** Frequencies are rad/s in every file; the screen shows rad/s or Hz. */

const TWO_PI = 2 * Math.PI;

/** @typedef {"rad/s" | "Hz"} FrequencyUnit */

/** @param {number} rad_s @param {FrequencyUnit} unit */
export function toShown(rad_s, unit) {
  return unit === "Hz" ? rad_s / TWO_PI : rad_s;
}

/** @param {number} shown @param {FrequencyUnit} unit */
export function fromShown(shown, unit) {
  return unit === "Hz" ? shown * TWO_PI : shown;
}

/** Units in which a measure counts frequency follow the screen's; all others stay. @param {string} unit
 *  @param {FrequencyUnit} shown */
export function shownUnit(unit, shown) {
  return unit === "rad/s" ? shown : unit;
}

/** A measure's value in the unit shown. @param {number} value @param {string} unit @param {FrequencyUnit} shown */
export function valueInUnit(value, unit, shown) {
  return unit === "rad/s" ? toShown(value, shown) : value;
}
