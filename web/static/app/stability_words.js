/** What is said on the plots when a closed loop is unstable. */

import { textWidth } from "./svg.js";

/** "closed loop unstable on heavy payload", as long as there is room; "" when all are stable. @param {any[]} cases
 *  @param {number} room px */
export function unstableWords(cases, room) {
  const names = cases.filter((one) => !one.stable).map((one) => one.name);
  if (names.length === 0) return "";
  const where = whereInWords(names, cases.length);
  const said = [...where.map((words) => `closed loop unstable${words}`), ...where.map((words) => `unstable${words}`), "unstable"];
  return said.find((text) => textWidth(text, 12, 600) <= room) ?? "unstable";
}

/** From long to short. @returns {string[]} */
function whereInWords(/** @type {string[]} */ names, /** @type {number} */ total) {
  if (names.length === total) return total === 1 ? [""] : [" on every case"];
  const all = names.length > 1 ? `${names.slice(0, -1).join(", ")} and ${names[names.length - 1]}` : names[0];
  return [` on ${all}`, ` on ${names.length > 1 ? `${names[0]} and ${names.length - 1} more` : names[0]}`, ` on ${names.length} of ${total} cases`];
}
