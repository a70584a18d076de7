/** Readings drawn where they are read: margins as bars at their crossover, other readings as a line at their frequency. */

import { caseIndexOf, markedRow, toneOf } from "./marked.js";
import { readingText } from "./requirement_words.js";
import { frequency } from "./format.js";

/**
 * @typedef {{id: string, row: number | null, tone: "met" | "short" | "open", strong: boolean, text: string,
 *            on: "gain" | "phase", shape: "bar" | "ring" | "line", rad_s: number, from: number, to: number}} Mark
 *   `from`, `to`: ends of a bar in the units of its axis; a ring stands at `to`
 */

/** Always drawn, from the requirement that asks for them or else from the nominal. */
const ALWAYS = ["phase_margin_deg", "gain_margin_db"];

/** @param {import("./scene.js").Scene} scene @returns {Mark[]} most important first */
export function marginMarks(scene) {
  const { assessment } = scene.frame;
  const focus = markedRow(scene.store);
  const rows = assessment.requirements.map((/** @type {any} */ row, /** @type {number} */ index) => ({ row, index }));
  const shown = ALWAYS.flatMap((measure) => {
    const asked = rows.filter((/** @type {any} */ one) => one.row.measure === measure);
    return asked.length ? asked : [{ row: nominalRow(assessment, measure), index: null }];
  });
  const focused = focus && scene.store.ui.focusedRow === focus.index ? rows[focus.index] : null;
  if (focused && !ALWAYS.includes(focused.row.measure)) shown.unshift(focused);
  return shown
    .map(({ row, index }) => markOf(scene, row, index, focus !== null && index === focus.index))
    .filter((mark) => mark !== null)
    .sort((a, b) => Number(b.strong) - Number(a.strong));
}

function nominalRow(/** @type {any} */ assessment, /** @type {string} */ measure) {
  const [nominal] = assessment.cases;
  return { measure, label: measure === "gain_margin_db" ? "gain margin" : "phase margin", unit: measure === "gain_margin_db" ? "dB" : "°",
    reading: nominal.readings[measure], case: nominal.name, met: null };
}

/** @returns {Mark | null} */
function markOf(/** @type {import("./scene.js").Scene} */ scene, /** @type {any} */ row, /** @type {number | null} */ index, /** @type {boolean} */ strong) {
  const { reading } = row;
  const rad_s = reading?.at_rad_s;
  if (!reading || reading.state !== "value" || !(rad_s > 0) || !scene.inSight(rad_s)) return null;
  const caseIndex = Math.max(0, caseIndexOf(scene.frame.assessment, row.case));
  const magnitude = scene.read("magnitude_db", rad_s, caseIndex);
  const phase = scene.read("phase_deg", rad_s, caseIndex);
  const base = {
    id: `${row.measure} ${index ?? "nominal"}`, row: index, tone: toneOf(row), strong, rad_s,
    text: `${row.label ?? row.measure} ${readingText(reading, row.unit, scene.unit)}${isPlace(row.measure) ? "" : ` at ${frequency(rad_s, scene.unit)}`}`,
  };
  if (row.measure === "phase_margin_deg" || row.measure === "delay_margin_s") {
    return { ...base, on: "phase", shape: "bar", from: nearestHalfTurn(phase), to: phase };
  }
  if (row.measure === "gain_margin_db" || row.measure === "gain_reduction_margin_db") {
    return { ...base, on: "gain", shape: "bar", from: 0, to: magnitude };
  }
  if (isPlace(row.measure)) return { ...base, on: "gain", shape: "ring", from: 0, to: row.measure.includes("crossover") ? 0 : magnitude };
  if (row.measure === "loop_phase_deg") return { ...base, on: "phase", shape: "ring", from: 0, to: phase };
  return { ...base, on: "gain", shape: "line", from: 0, to: magnitude };
}

/** Measures that are themselves a frequency. @param {string} measure */
function isPlace(measure) {
  return measure === "crossover_rad_s" || measure === "last_crossover_rad_s" || measure === "bandwidth_rad_s";
}

/** −180° + k·360° closest to a phase. @param {number} phase */
function nearestHalfTurn(phase) {
  return Math.round((phase + 180) / 360) * 360 - 180;
}
