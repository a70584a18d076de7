/** Names what is drawn: the nominal, the band of all cases, the worst case, the pinned design, the curve before the move. */

import { keyed } from "./keyed.js";
import { markedRow } from "./marked.js";
import { set, svg, textWidth } from "./svg.js";

const SIZE = 12;
const SWATCH = 22;
const GAP = 16;

/** @param {SVGElement} parent @param {import("./store.js").Store} store */
export function curveKey(parent, store) {
  const drawItems = keyed(parent, (/** @type {any} */ item) => item.kind,
    (item) => {
      const swatch = item.kind === "band" ? svg("rect", { class: "swatch band", y: -10, width: SWATCH, height: 11 }) : svg("path", { class: `swatch ${item.kind}`, d: `M0 -4H${SWATCH}` });
      const text = svg("text", { class: "key-text", x: SWATCH + 6 });
      return { node: svg("g", {}, swatch, text), text };
    },
    (part, item) => {
      set(part.text, { text: item.text });
      set(part.node, { transform: `translate(${item.x.toFixed(1)} ${item.y})` });
    });
  return {
    /** @param {number} right @param {number} y @param {number} room */
    draw(right, y, room) {
      const items = itemsOf(store).map((item) => ({ ...item, width: SWATCH + 6 + textWidth(item.text, SIZE) + GAP }));
      while (items.length > 1 && items.reduce((sum, item) => sum + item.width, 0) > room) items.splice(0, 1);
      let x = right + GAP;
      for (const item of [...items].reverse()) {
        x -= item.width;
        Object.assign(item, { x, y });
      }
      drawItems(items);
    },
  };
}

/** Least needed first: that is what goes when room is short. */
function itemsOf(/** @type {import("./store.js").Store} */ store) {
  const cases = store.lastGood?.assessment.cases ?? [];
  const marked = markedRow(store);
  const items = [];
  if (store.holding) items.push({ kind: "ghost", text: "before the move" });
  if (cases.length > 1) items.push({ kind: "band", text: cases.length === 2 ? "both cases" : `all ${cases.length} cases` });
  if (store.pinned) items.push({ kind: "pinned", text: "pinned" });
  items.push({ kind: "nominal", text: cases[0]?.name ?? "nominal" });
  if (marked && marked.caseIndex > 0) items.push({ kind: "worst", text: marked.row.case });
  return items;
}
