/** Requirements on the loop gain and phase at chosen frequencies, drawn as fences with teeth on the forbidden side. */

import { keyed } from "./keyed.js";
import { toneOf } from "./marked.js";
import { set, svg } from "./svg.js";

const TOOTH = 6;
const SHORT_FENCE_PX = 16;

/** @param {SVGElement} parent @param {import("./scene.js").Scene} scene */
export function limitFences(parent, scene) {
  const draw = keyed(parent, (/** @type {any} */ fence) => fence.key, () => ({ node: svg("path") }), (part, fence) => {
    set(part.node, { class: `fence ${fence.tone}${fence.focused ? " strong-mark" : ""}`, d: fence.d });
  });
  return { draw: () => draw(fencesOf(scene)) };
}

function fencesOf(/** @type {import("./scene.js").Scene} */ scene) {
  return scene.frame.assessment.requirements.flatMap((/** @type {any} */ row, /** @type {number} */ index) => {
    const onGain = row.measure === "loop_gain_db";
    if (!onGain && row.measure !== "loop_phase_deg") return [];
    const axis = onGain ? scene.gain : scene.phase;
    const span = onGain ? scene.geometry.gain : scene.geometry.phase;
    return ["at_least", "at_most"].flatMap((side) => {
      const points = pointsOf(row, side).map(([rad_s, limit]) => [scene.x.px(rad_s), axis.px(limit)]);
      if (points.length === 0) return [];
      return [{ key: `${index} ${side}`, tone: toneOf(row), focused: scene.store.ui.focusedRow === index, d: fencePath(points, side === "at_least" ? 1 : -1, span, scene) }];
    });
  });
}

/** @returns {number[][]} */
function pointsOf(/** @type {any} */ row, /** @type {string} */ side) {
  const limit = row[side];
  if (row.mask) return (row.mask_side ?? "at_least") === side ? row.mask : [];
  if (typeof limit !== "number") return [];
  if (row.over_rad_s) return row.over_rad_s.map((/** @type {number} */ rad_s) => [rad_s, limit]);
  return typeof row.at_rad_s === "number" ? [[row.at_rad_s, limit]] : [];
}

function fencePath(/** @type {number[][]} */ points, /** @type {1 | -1} */ down, /** @type {{top: number, bottom: number}} */ span,
  /** @type {import("./scene.js").Scene} */ scene) {
  const single = points.length === 1;
  const line = single ? [[points[0][0] - SHORT_FENCE_PX, points[0][1]], [points[0][0] + SHORT_FENCE_PX, points[0][1]]] : points;
  const inside = (/** @type {number} */ x, /** @type {number} */ y) => x >= scene.x.start && x <= scene.x.end && y >= span.top && y <= span.bottom;
  let d = "";
  for (let at = 0; at + 1 < line.length; at += 1) {
    const [[x0, y0], [x1, y1]] = [line[at], line[at + 1]];
    const steps = Math.max(1, Math.round((x1 - x0) / 8));
    for (let step = 0; step < steps; step += 1) {
      const [a, b] = [step / steps, (step + 1) / steps];
      const [xa, ya, xb, yb] = [x0 + (x1 - x0) * a, y0 + (y1 - y0) * a, x0 + (x1 - x0) * b, y0 + (y1 - y0) * b];
      if (inside(xa, ya) && inside(xb, yb)) d += `M${xa.toFixed(1)} ${ya.toFixed(1)}L${xb.toFixed(1)} ${yb.toFixed(1)}m-3 0l-3 ${down * TOOTH}`;
    }
  }
  return d;
}
