/** Which requirement, and which plant case with it, the charts mark: the focused one, else the worst. */

/** @typedef {{index: number, row: any, caseIndex: number}} Marked */

/** @param {import("./store.js").Store} store @returns {Marked | null} */
export function markedRow(store) {
  const assessment = store.lastGood?.assessment;
  if (!assessment?.requirements?.length) return null;
  const focused = store.ui.focusedRow;
  const index = focused !== null && assessment.requirements[focused] ? focused : worstRow(assessment.requirements);
  const row = assessment.requirements[index];
  return { index, row, caseIndex: caseIndexOf(assessment, row.case) };
}

/** Rows without a number first, then by slack. @param {any[]} rows @returns {number} */
export function worstRow(rows) {
  const weight = (/** @type {any} */ row) => (row.slack ?? (row.met === true ? Infinity : row.met === null ? 1e6 : -Infinity));
  return rows.reduce((worst, row, index) => (weight(row) < weight(rows[worst]) ? index : worst), 0);
}

/** @param {any} assessment @param {string | null} name */
export function caseIndexOf(assessment, name) {
  return assessment.cases.findIndex((/** @type {any} */ one) => one.name === name);
}

/** How a row stands, as the word that colours and marks it. @param {any} row @returns {"met" | "short" | "open"} */
export function toneOf(row) {
  return row.met === true ? "met" : row.met === false ? "short" : "open";
}
