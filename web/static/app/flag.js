/** The flag at the handle in hand: what it is, where it is, and what the move did to the worst requirement. */

import { markedRow, worstRow } from "./marked.js";
import { joinUnit, signed } from "./format.js";
import { placeLabels } from "./labels.js";
import { shownUnit, valueInUnit } from "./units.js";
import { set, show, svg, textWidth } from "./svg.js";

/** @param {SVGElement} parent */
export function flag(parent) {
  const ground = svg("rect", { class: "flag-ground", rx: 4 });
  const name = svg("tspan", { class: "flag-name" });
  const value = svg("tspan", { class: "flag-value", dx: 5 });
  const first = svg("text", { x: 10, y: 18 }, name, value);
  const second = svg("text", { class: "flag-change", x: 10, y: 35 });
  const node = svg("g", { class: "flag", "aria-hidden": "true" }, ground, first, second);
  parent.append(node);
  show(node, false);
  return {
    hide: () => show(node, false),
    /** @param {{name: string, value: string, change: string, x: number, y: number}} content
     *  @param {import("./labels.js").Box} within @param {import("./labels.js").Box[]} obstacles */
    draw(content, within, obstacles) {
      show(node, true);
      set(name, { text: content.name });
      set(value, { text: content.value });
      set(second, { text: content.change });
      const top = textWidth(content.name, 12) + textWidth(content.value, 12, 700) + 5;
      const width = Math.ceil(Math.max(top, textWidth(content.change, 12)) + 20);
      const height = content.change ? 44 : 27;
      set(ground, { width, height });
      const wish = { id: "flag", x: content.x, y: content.y, width, height, within, gap: 22 };
      const box = /** @type {import("./labels.js").Box} */ (placeLabels([wish], obstacles).get("flag"));
      set(node, { transform: `translate(${box.x.toFixed(1)} ${box.y.toFixed(1)})` });
      return box;
    },
  };
}

/** "phase margin +2.1° · 1.4° short": the worst row now, against the same row when the hand closed.
 *  @param {import("./store.js").Store} store @returns {string} */
export function changeInWords(store) {
  const now = store.lastGood?.assessment;
  const before = store.holding?.frame?.assessment;
  if (!now?.requirements?.length || !before) return "";
  const index = markedRow(store)?.index ?? worstRow(now.requirements);
  const row = now.requirements[index];
  const old = before.requirements[index];
  const standing = row.met === true ? "met" : row.shortfall || (row.met === null ? "not assessable" : row.reading?.state ?? "not met");
  return [`${row.label} ${difference(row, old, store.ui.unit)}`.trim(), standing].join(" · ");
}

function difference(/** @type {any} */ row, /** @type {any} */ old, /** @type {import("./units.js").FrequencyUnit} */ unit) {
  if (row.reading?.state !== "value" || old?.reading?.state !== "value") return "";
  const change = valueInUnit(row.reading.value - old.reading.value, row.unit, unit);
  const size = Math.max(Math.abs(row.reading.value), 1e-12);
  if (Math.abs(row.reading.value - old.reading.value) < 5e-4 * size) return "unchanged";
  return joinUnit(signed(change, 2), shownUnit(row.unit, unit));
}
