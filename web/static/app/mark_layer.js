/** Draws the marks of readings with their labels, and the limits that requirements set on the loop gain. */

import { placeLabels, boxesAlong } from "./labels.js";
import { keyed } from "./keyed.js";
import { marginMarks } from "./margin_marks.js";
import { set, svg, textWidth } from "./svg.js";

/** @typedef {import("./margin_marks.js").Mark} Mark */

const LABEL_HEIGHT = 20;
const SIZE = 12;

/** @param {SVGElement} bars under the handles @param {SVGElement} labels above them
 *  @param {import("./scene.js").Scene} scene */
export function markLayer(bars, labels, scene) {
  const drawBars = keyed(bars, (/** @type {Mark} */ mark) => `${mark.id} ${mark.shape}`,
    () => {
      const line = svg("path", { class: "mark-line" });
      const ring = svg("circle", { class: "mark-ring", r: 5 });
      return { node: svg("g"), line, ring };
    },
    (part, mark) => {
      const x = scene.x.px(mark.rad_s);
      const axis = mark.on === "gain" ? scene.gain : scene.phase;
      const [y0, y1] = [clamp(scene, mark.on, axis.px(mark.from)), clamp(scene, mark.on, axis.px(mark.to))];
      set(part.node, { class: `mark ${mark.shape} ${mark.tone}${mark.strong ? " strong-mark" : ""}` });
      if (part.node.childElementCount === 0) part.node.append(part.line, part.ring);
      const { gain, phase } = scene.geometry;
      set(part.line, { d: mark.shape === "bar" ? `M${x - 4} ${y0}H${x + 4}M${x} ${y0}V${y1}M${x - 4} ${y1}H${x + 4}` : `M${x} ${gain.top}V${phase.bottom}` });
      set(part.ring, { cx: x, cy: y1, visibility: mark.shape === "ring" ? "visible" : "hidden" });
    });
  const drawLabels = keyed(labels, (/** @type {any} */ item) => item.mark.id,
    (item) => {
      const ground = svg("rect", { class: "label-ground", rx: 3, height: LABEL_HEIGHT });
      const text = svg("text", { class: "label-text", y: 14, x: 7 });
      const node = svg("g", {}, ground, text);
      const part = { node, ground, text, row: item.mark.row };
      node.addEventListener("pointerenter", () => part.row !== null && scene.store.setUi({ focusedRow: part.row }));
      node.addEventListener("pointerleave", () => scene.store.setUi({ focusedRow: null }));
      return part;
    },
    (part, { mark, box }) => {
      part.row = mark.row;
      set(part.node, { class: `mark-label ${mark.tone}${mark.strong ? " strong-mark" : ""}`, transform: `translate(${box.x.toFixed(1)} ${box.y.toFixed(1)})` });
      set(part.ground, { width: box.width });
      set(part.text, { text: mark.text });
    });

  return {
    /** @param {import("./labels.js").Box[]} obstacles @returns {import("./labels.js").Box[]} where labels stand */
    draw(obstacles) {
      const marks = marginMarks(scene);
      drawBars(marks);
      const wanted = marks.map((mark) => wish(scene, mark));
      const barBoxes = marks.filter((mark) => mark.shape === "bar").map((mark) => barBox(scene, mark));
      const boxes = placeLabels(wanted, [...obstacles, ...barBoxes, ...curveBoxes(scene)]);
      drawLabels(marks.map((mark) => ({ mark, box: boxes.get(mark.id) })));
      return [...boxes.values()];
    },
  };
}

function wish(/** @type {import("./scene.js").Scene} */ scene, /** @type {Mark} */ mark) {
  const { left, right } = scene.geometry;
  const span = scene.geometry[mark.on];
  const axis = mark.on === "gain" ? scene.gain : scene.phase;
  const middle = mark.shape === "bar" ? (mark.from + mark.to) / 2 : mark.to;
  const y = mark.shape === "line" ? span.top + 14 : clamp(scene, mark.on, axis.px(middle));
  return {
    id: mark.id, x: scene.x.px(mark.rad_s), y, width: textWidth(mark.text, SIZE, mark.strong ? 600 : 400) + 14, height: LABEL_HEIGHT,
    within: { x: left + 2, y: span.top + 2, width: right - left - 4, height: span.bottom - span.top - 4 },
  };
}

function barBox(/** @type {import("./scene.js").Scene} */ scene, /** @type {Mark} */ mark) {
  const axis = mark.on === "gain" ? scene.gain : scene.phase;
  const [a, b] = [clamp(scene, mark.on, axis.px(mark.from)), clamp(scene, mark.on, axis.px(mark.to))];
  return { x: scene.x.px(mark.rad_s) - 4, y: Math.min(a, b), width: 8, height: Math.abs(a - b) };
}

function curveBoxes(/** @type {import("./scene.js").Scene} */ scene) {
  const { start, end } = scene.x;
  const along = (/** @type {"magnitude_db" | "phase_deg"} */ name, /** @type {import("./scales.js").Scale} */ axis) =>
    boxesAlong((px) => axis.px(scene.read(name, scene.x.value(px))), start, end, 10);
  return [...along("magnitude_db", scene.gain), ...along("phase_deg", scene.phase)];
}

function clamp(/** @type {import("./scene.js").Scene} */ scene, /** @type {"gain" | "phase"} */ on, /** @type {number} */ y) {
  const { top, bottom } = scene.geometry[on];
  return Math.max(top, Math.min(bottom, y));
}
