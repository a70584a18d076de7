/** What is said on the plots when a closed loop is unstable. */

/** "closed loop unstable on heavy payload", or "". @param {any[]} cases */
export function unstableWords(cases) {
  const names = cases.filter((one) => !one.stable).map((one) => one.name);
  if (names.length === 0) return "";
  if (names.length === cases.length) return cases.length === 1 ? "closed loop unstable" : "closed loop unstable on every case";
  return `closed loop unstable on ${names.length > 2 ? `${names.slice(0, 2).join(", ")} and ${names.length - 2} more` : names.join(" and ")}`;
}
