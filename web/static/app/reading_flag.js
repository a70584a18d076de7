/** Our own reading of the curves under the pointer: a hairline and a small table, nominal and worst. */

import { keyed } from "./keyed.js";
import { set, show, svg, textWidth } from "./svg.js";

const ROW = 17;

/** @typedef {{text: string, kind: string}} Line */

/** @param {SVGElement} parent */
export function readingFlag(parent) {
  const hair = svg("path", { class: "hair" });
  const ground = svg("rect", { class: "reading-ground", rx: 4 });
  const lines = svg("g");
  const table = svg("g", {}, ground, lines);
  const node = svg("g", { class: "reading-flag", "aria-hidden": "true" }, hair, table);
  parent.append(node);
  show(node, false);
  const drawLines = keyed(lines, (/** @type {any} */ item) => item.key, () => ({ node: svg("text") }),
    (part, item) => set(part.node, { class: `reading-line ${item.kind}`, x: 9, y: 16 + item.index * ROW, text: item.text }));
  return {
    hide: () => show(node, false),
    /** @param {{x: number, y: number}} place @param {Line[]} content @param {{left: number, right: number, top: number, bottom: number}} within */
    draw(place, content, within) {
      show(node, true);
      set(hair, { d: `M${place.x} ${within.top}V${within.bottom}` });
      drawLines(content.map((line, index) => ({ ...line, index, key: `${index}` })));
      const width = Math.max(...content.map((line) => textWidth(line.text, 12, line.kind === "head" ? 600 : 400))) + 18;
      const height = content.length * ROW + 8;
      set(ground, { width, height });
      const right = place.x + 14 + width < within.right;
      const x = right ? place.x + 14 : place.x - 14 - width;
      const y = Math.max(within.top + 4, Math.min(within.bottom - height - 4, place.y - height - 10));
      set(table, { transform: `translate(${x} ${y})` });
    },
  };
}
