/** Where the focused requirement is read on the responses: a small ring at its time. */

import { curveOf, valueAt } from "./envelope.js";
import { caseIndexOf, markedRow, toneOf } from "./marked.js";
import { pushedInside } from "./labels.js";
import { readingText } from "./requirement_words.js";
import { RESPONSES } from "./response_picture.js";
import { linearScale } from "./scales.js";
import { set, show, svg, textWidth } from "./svg.js";

/** @type {Record<string, "command" | "load" | "effort">} */
const READ_ON = {
  overshoot_pct: "command", undershoot_pct: "command", rise_time_s: "command", settling_time_s: "command",
  load_peak: "load", load_settling_time_s: "load", peak_effort: "effort",
};

/** @param {SVGElement} parent @param {import("./store.js").Store} store */
export function responseMark(parent, store) {
  const line = svg("path", { class: "mark-line" });
  const ring = svg("circle", { class: "mark-ring", r: 5 });
  const ground = svg("rect", { class: "label-ground", rx: 3, height: 20 });
  const text = svg("text", { class: "label-text", x: 7, y: 14 });
  const label = svg("g", {}, ground, text);
  const node = svg("g", {}, line, ring, label);
  parent.append(node);
  return {
    /** @param {import("./loop_picture.js").Picture} picture */
    draw(picture) {
      const place = placeOf(store, picture);
      show(node, place !== null);
      if (!place) return;
      set(node, { class: `response-mark mark-label strong-mark ${place.tone}` });
      set(line, { d: `M${place.x} ${place.plot.top}V${place.plot.bottom}` });
      set(ring, { cx: place.x, cy: place.y });
      const width = textWidth(place.text, 12, 600) + 14;
      const within = { x: picture.left + 2, y: place.plot.top + 2, width: picture.right - picture.left - 4, height: place.plot.bottom - place.plot.top - 4 };
      const above = place.y - 32 > place.plot.top;
      const box = pushedInside({ x: place.x + 10, y: above ? place.y - 30 : place.y + 12, width, height: 20 }, within);
      set(label, { transform: `translate(${box.x} ${box.y})` });
      set(ground, { width });
      set(text, { text: place.text });
    },
  };
}

function placeOf(/** @type {import("./store.js").Store} */ store, /** @type {import("./loop_picture.js").Picture} */ picture) {
  const marked = markedRow(store);
  if (!marked || store.ui.focusedRow !== marked.index) return null;
  const { row } = marked;
  const name = READ_ON[row.measure];
  const time = row.reading?.at_s ?? (row.measure.endsWith("settling_time_s") ? row.reading?.value : null);
  if (!name || row.reading.state !== "value" || typeof time !== "number") return null;
  const { arrays, assessment } = /** @type {any} */ (store.lastGood);
  const plot = picture.plots[RESPONSES.indexOf(name)];
  const x = linearScale(plot.x, picture.left, picture.right).px(time);
  const value = valueAt(arrays.time_s.data, curveOf(arrays[name], Math.max(0, caseIndexOf(assessment, row.case))), time);
  if (!(x >= picture.left && x <= picture.right) || !Number.isFinite(value)) return null;
  const y = Math.max(plot.top, Math.min(plot.bottom, linearScale(plot.y, plot.bottom, plot.top).px(value)));
  return { plot, x, y, tone: toneOf(row), text: `${row.label} ${readingText(row.reading, row.unit, store.ui.unit)}` };
}
