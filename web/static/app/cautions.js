import { el } from "./element.js";

/** The same words as in the hand-over file and in the README. */
const CAUTIONS = [
  "A computed margin is a statement about a model. Commission at low gain with travel and current limits set, a reachable emergency stop and nobody in the machine's reach; validate on the hardware before trusting it unattended.",
  "The safety functions of a machine are designed under the standards and by the people that local rules require (machinery: ISO 12100, ISO 13849-1, IEC 60204-1; drives: IEC 61800-5-2; functional safety: IEC 61508); this tool is no part of them.",
  "Mains and high-energy converters: qualified persons only, and local codes come first.",
];

/** What has to be read before anything is handed over. */
export const cautions = () => el("section", { class: "cautions", "aria-label": "cautions" },
  el("h3", { text: "before this moves anything" }), ...CAUTIONS.map((text) => el("p", { text })));
