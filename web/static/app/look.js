/** How each kind of curve is drawn, the same by Plotly when settled and by the live layer while held. */

import { tokens } from "./theme.js";

/** @typedef {{color: string, width: number, dash: number[]}} Look */

/** Token, width in px, dash in px. @type {Record<string, [string, number, number[]]>} */
const LOOKS = {
  nominal: ["loop", 2.2, []],
  worst: ["worst", 1.4, [6, 4]],
  pinned: ["pinned", 1.6, [2, 3]],
  limit: ["short", 1.2, [8, 3, 2, 3]],
};

/** In the colours of the theme in force. @returns {Record<string, Look>} */
export function looks() {
  const { band, "band-opacity": opacity } = tokens("band", "band-opacity");
  const drawn = Object.entries(LOOKS).map(([kind, [token, width, dash]]) => [kind, { color: tokens(token)[token], width, dash }]);
  return { ...Object.fromEntries(drawn), band: { color: withOpacity(band, Number(opacity)), width: 0, dash: [] } };
}

/** @param {string} hex #rrggbb @param {number} opacity */
function withOpacity(hex, opacity) {
  const parts = [1, 3, 5].map((at) => Number.parseInt(hex.slice(at, at + 2), 16));
  return `rgba(${parts.join(",")},${opacity})`;
}
