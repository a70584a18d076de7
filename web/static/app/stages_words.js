import { number, signed } from "./format.js";
import { toShown } from "./units.js";

/**
 * How each kind of stage reads as a sentence. A part is plain text, a number that can be typed, or words
 * made from the engine's facts.
 *
 * @typedef {string
 *   | {number: string, what: string, frequency?: boolean, glyph?: "o"|"x"}
 *   | ((facts: object|null, shown: "rad/s"|"Hz") => string)} Part
 */

const corner = (glyph, what, name = "corner_rad_s") => ({ number: name, what, frequency: true, glyph });
const damping = (what, name = "damping") => ({ number: name, what });
const unit = (_facts, shown) => ` ${shown}`;

/** @type {Record<string, (stage: object) => Part[]>} */
const SENTENCES = {
  lead_lag: (stage) => {
    const zero = corner("o", "zero", "zero_rad_s");
    const pole = corner("x", "pole", "pole_rad_s");
    return isLead(stage)
      ? ["lead from ", zero, " to ", pole, unit, peakPhase, moreAbove]
      : ["lag from ", pole, " to ", zero, unit, peakPhase, lessAbove];
  },
  proportional_integral: () => ["proportional-integral below ", corner("o", "zero"), unit, atCrossover],
  integrator: () => ["integrator", atCrossover],
  real_zero: () => ["zero at ", corner("o", "zero"), unit, atCrossover],
  real_pole: () => ["pole at ", corner("x", "pole"), unit, atCrossover],
  complex_zeros: () => ["pair of zeros at ", corner("o", "natural frequency", "natural_rad_s"), unit, ", damping ", damping("damping"), atCrossover],
  complex_poles: () => ["pair of poles at ", corner("x", "natural frequency", "natural_rad_s"), unit, ", damping ", damping("damping"), atCrossover],
  notch: () => ["notch at ", corner(null, "centre", "centre_rad_s"), unit, ", damping ", damping("damping of the zeros", "zero_damping"), " over ",
    damping("damping of the poles", "pole_damping"), depth, atCrossover],
  rational: (stage) => ["rational stage with gain ", { number: "gain", what: "gain" }, `, ${counted(stage.zeros, "zero")} and ${counted(stage.poles, "pole")}`, atCrossover],
};

/** @param {object} stage @returns {Part[]} */
export const sentenceOf = (stage) => SENTENCES[stage.kind](stage);

/** Lead and lag read differently, so a row is built anew when one turns into the other. */
export const isLead = (stage) => stage.zero_rad_s <= stage.pole_rad_s;

/** What the trade calls a stage. */
export function tradeName(stage) {
  if (stage.kind === "lead_lag") return isLead(stage) ? "lead" : "lag";
  return {
    proportional_integral: "proportional-integral", real_zero: "zero", real_pole: "pole", complex_zeros: "pair of zeros",
    complex_poles: "pair of poles", rational: "rational stage",
  }[stage.kind] ?? stage.kind;
}

/** The stage's own name where it has one, else what the trade calls it. */
export const stageName = (stage) => stage.name || tradeName(stage);

function peakPhase(facts, shown) {
  if (!facts || facts.peak_phase_deg === undefined) return "";
  if (Math.abs(facts.peak_phase_deg) < 0.005) return " changes nothing while both corners agree";
  return ` gives ${signed(facts.peak_phase_deg, 3)}° at ${number(toShown(facts.at_rad_s, shown))} ${shown}`;
}

const above = (facts, word) => (facts?.high_frequency_gain_db ? `, and ${number(Math.abs(facts.high_frequency_gain_db))} dB ${word} above` : "");
const moreAbove = (facts) => above(facts, "more effort");
const lessAbove = (facts) => above(facts, "less gain");

function depth(facts) {
  return facts?.depth_db === undefined ? "" : `, ${number(Math.abs(facts.depth_db))} dB ${facts.depth_db < 0 ? "high" : "deep"}`;
}

function atCrossover(facts) {
  const phase = facts?.phase_at_crossover_deg;
  if (phase === undefined || Math.abs(phase) < 0.005) return "";
  return phase < 0 ? `, costs ${number(-phase)}° at the crossover` : `, gives ${signed(phase, 3)}° at the crossover`;
}

function counted(list = [], word) {
  return list.length === 0 ? `no ${word}s` : `${list.length} ${word}${list.length === 1 ? "" : "s"}`;
}
