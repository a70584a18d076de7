/**
 * What a hand can take hold of in a compensator: each corner, damping, notch width and depth as a small value
 * with its name and the edit that sets it. No drawing here.
 *
 * @typedef {{id: string, stage: number, kind: "o" | "x" | "oo" | "xx" | "notch", name: string, short: string,
 *            rad_s: number, enabled: boolean, set: (design: any, rad_s: number) => any}} Corner
 * @typedef {{id: string, stage: number, name: string, value: number, least: number, most: number, unit: string,
 *            enabled: boolean, set: (design: any, value: number) => any}} Shape
 */

import { stageName } from "./stages_words.js";

export const LEAST_RAD_S = 1e-6;
export const MOST_RAD_S = 1e9;
const LEAST_DAMPING = 1e-4;
const DEEPEST_DB = 80;

/** @param {any} stage */
export function isAwake(stage) {
  return stage.enabled !== false;
}

/** @type {Record<string, [string, "o" | "x" | "oo" | "xx" | "notch", string][]>} field, mark, word */
const CORNERS = {
  lead_lag: [["zero_rad_s", "o", "zero"], ["pole_rad_s", "x", "pole"]],
  proportional_integral: [["corner_rad_s", "o", "zero"]],
  real_zero: [["corner_rad_s", "o", ""]],
  real_pole: [["corner_rad_s", "x", ""]],
  complex_zeros: [["natural_rad_s", "oo", ""]],
  complex_poles: [["natural_rad_s", "xx", ""]],
  notch: [["centre_rad_s", "notch", "centre"]],
};

/** @param {any} design @returns {Corner[]} */
export function cornersOf(design) {
  return stagesOf(design).flatMap((stage, index) => (CORNERS[stage.kind] ?? []).map(([field, kind, word]) => ({
    id: `${index}.${field}`,
    stage: index,
    kind,
    name: [stageName(stage), word].filter(Boolean).join(" "),
    short: word || stageName(stage),
    rad_s: stage[field],
    enabled: isAwake(stage),
    set: (/** @type {any} */ from, /** @type {number} */ rad_s) => withStage(from, index, { [field]: limited(rad_s) }),
  })));
}

/** Damping of the pairs. @param {any} design @returns {Shape[]} */
export function dampingsOf(design) {
  return stagesOf(design).flatMap((stage, index) => {
    if (stage.kind !== "complex_zeros" && stage.kind !== "complex_poles") return [];
    return [shape(stage, index, "damping", "damping", stage.damping, LEAST_DAMPING, 2, "",
      (from, value) => withStage(from, index, { damping: value }))];
  });
}

/** Width (damping of the notch's poles; its arms stand where it takes 3 dB) and depth of each notch.
 *  @param {any} design @returns {{width: Shape, depth: Shape, stage: number, rad_s: number}[]} */
export function notchesOf(design) {
  return stagesOf(design).flatMap((stage, index) => {
    if (stage.kind !== "notch") return [];
    const depth = depthOf(stage);
    return [{
      stage: index,
      rad_s: stage.centre_rad_s,
      width: shape(stage, index, "width", "width as pole damping", stage.pole_damping, 0.005, 2, "",
        (from, value) => withStage(from, index, { pole_damping: value, zero_damping: zeroDamping(value, depthOf(from.compensator.stages[index])) })),
      depth: shape(stage, index, "depth", "depth", depth, 0, DEEPEST_DB, "dB",
        (from, value) => withStage(from, index, { zero_damping: zeroDamping(from.compensator.stages[index].pole_damping, value) })),
    }];
  });
}

/** Both corners of a lead or lag moved by one factor: their ratio stays. @param {any} design @param {number} index
 *  @param {number} zero_rad_s where the zero goes */
export function movedTogether(design, index, zero_rad_s) {
  const stage = design.compensator.stages[index];
  const ratio = stage.pole_rad_s / stage.zero_rad_s;
  return withStage(design, index, { zero_rad_s, pole_rad_s: rounded(zero_rad_s * ratio) });
}

/** @param {any} design @param {number} gain */
export function withGainOf(design, gain) {
  return { ...design, compensator: { ...design.compensator, gain } };
}

/** @param {any} stage depth of a notch in dB, positive downwards */
function depthOf(stage) {
  if (!(stage.zero_damping > 0)) return DEEPEST_DB;
  return Math.min(DEEPEST_DB, 20 * Math.log10(stage.pole_damping / stage.zero_damping));
}

function zeroDamping(/** @type {number} */ poleDamping, /** @type {number} */ depth_db) {
  return rounded(poleDamping * 10 ** (-depth_db / 20));
}

function shape(/** @type {any} */ stage, /** @type {number} */ index, /** @type {string} */ key, /** @type {string} */ word,
  /** @type {number} */ value, /** @type {number} */ least, /** @type {number} */ most, /** @type {string} */ unit,
  /** @type {(design: any, value: number) => any} */ change) {
  return {
    id: `${index}.${key}`, stage: index, name: `${stageName(stage)} ${word}`, value, least, most, unit, enabled: isAwake(stage),
    set: (/** @type {any} */ from, /** @type {number} */ wanted) => change(from, Math.min(most, Math.max(least, wanted))),
  };
}

/** @param {any} design @returns {any[]} */
function stagesOf(design) {
  return design?.compensator?.stages ?? [];
}

function withStage(/** @type {any} */ design, /** @type {number} */ index, /** @type {Record<string, any>} */ fields) {
  const stages = design.compensator.stages.map((/** @type {any} */ stage, /** @type {number} */ at) =>
    (at === index ? { ...stage, ...fields } : stage));
  return { ...design, compensator: { ...design.compensator, stages } };
}

function limited(/** @type {number} */ rad_s) {
  return Math.min(MOST_RAD_S, Math.max(LEAST_RAD_S, rad_s));
}

/** A dragged corner is good to a pixel: six digits are plenty, and files stay readable. @param {number} value */
export function rounded(value) {
  return Number(value.toPrecision(6));
}
