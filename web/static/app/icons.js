/** The few icons, drawn here as strokes. */

import { svg } from "./svg.js";

/** @type {Record<string, string>} */
const PATHS = {
  undo: "M6.5 3.5L3 7L6.5 10.5M3.5 7H10A3.5 3.5 0 0 1 10 14H7",
  redo: "M9.5 3.5L13 7L9.5 10.5M12.5 7H6A3.5 3.5 0 0 0 6 14H9",
  moon: "M13 9.6A5.6 5.6 0 1 1 6.4 3A4.6 4.6 0 0 0 13 9.6Z",
  sun: "M8 5.2A2.8 2.8 0 1 1 8 10.8A2.8 2.8 0 1 1 8 5.2M8 1.5V2.8M8 13.2V14.5M1.5 8H2.8M13.2 8H14.5M3.4 3.4L4.3 4.3M11.7 11.7L12.6 12.6M3.4 12.6L4.3 11.7M11.7 4.3L12.6 3.4",
  down: "M4.5 6.5L8 10L11.5 6.5",
};

/** @param {string} name */
export function icon(name) {
  return svg("svg", { class: "icon", viewBox: "0 0 16 16", width: 16, height: 16, "aria-hidden": "true" }, svg("path", { d: PATHS[name] }));
}
