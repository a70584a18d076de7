/**
 * What a pointer does on the ground of a chart: the wheel zooms about it, a pulled box zooms into it, resting
 * over a plot reads the curves there.
 *
 * @typedef {{node: SVGElement, view: import("./view.js").View, scale: () => import("./scales.js").Scale,
 *            plots: () => {top: number, bottom: number}[], logarithmic: boolean, changed: () => void,
 *            hover: (place: {x: number, y: number} | null) => void, limits: () => [number, number]}} Surface
 */

import { set, show, svg } from "./svg.js";

const LEAST_BOX_PX = 6;
const WHEEL_STEP_MS = 500;

/** @param {Surface} surface */
export function zoomSurface(surface) {
  const ground = svg("rect", { class: "surface" });
  const box = svg("rect", { class: "zoom-box" });
  surface.node.prepend(ground);
  surface.node.append(box);
  show(box, false);
  followWheel(ground, surface);
  followBox(ground, box, surface);
  return {
    draw() {
      const { start, end } = surface.scale();
      const plots = surface.plots();
      set(ground, { x: start, y: plots[0].top, width: Math.max(0, end - start), height: plots[plots.length - 1].bottom - plots[0].top });
    },
  };
}

function placeOf(/** @type {PointerEvent | WheelEvent} */ event, /** @type {SVGElement} */ node) {
  const frame = node.getBoundingClientRect();
  return { x: event.clientX - frame.left, y: event.clientY - frame.top };
}

function followWheel(/** @type {SVGElement} */ ground, /** @type {Surface} */ surface) {
  let last = 0;
  ground.addEventListener("wheel", (event) => {
    // Where the page itself scrolls, a plain wheel belongs to the page.
    const pageScrolls = document.documentElement.scrollHeight > window.innerHeight + 2;
    if (pageScrolls && !event.ctrlKey) return;
    event.preventDefault();
    const scale = surface.scale();
    const at = toRange(surface, scale.value(placeOf(event, surface.node).x));
    const factor = Math.exp(Math.max(-0.5, Math.min(0.5, event.deltaY * 0.0016)));
    const now = event.timeStamp;
    surface.view.choose(limited([at + (scale.from - at) * factor, at + (scale.to - at) * factor], surface.limits()), now - last > WHEEL_STEP_MS);
    last = now;
    surface.changed();
  }, { passive: false });
}

function followBox(/** @type {SVGElement} */ ground, /** @type {SVGElement} */ box, /** @type {Surface} */ surface) {
  let from = /** @type {number | null} */ (null);
  ground.addEventListener("pointerdown", (event) => {
    if (event.button !== 0 || event.pointerType === "touch") return;
    from = placeOf(event, surface.node).x;
    ground.setPointerCapture(event.pointerId);
  });
  ground.addEventListener("pointermove", (event) => {
    const place = placeOf(event, surface.node);
    if (from === null) return surface.hover(place);
    surface.hover(null);
    drawBox(box, surface, from, place.x);
    return undefined;
  });
  ground.addEventListener("pointerup", (event) => {
    if (from === null) return;
    const { start, end, value } = surface.scale();
    const [a, b] = [from, placeOf(event, surface.node).x].map((x) => Math.max(start, Math.min(end, x))).sort((one, other) => one - other);
    from = null;
    show(box, false);
    if (b - a < LEAST_BOX_PX) return;
    surface.view.choose(limited([toRange(surface, value(a)), toRange(surface, value(b))], surface.limits()));
    surface.changed();
  });
  ground.addEventListener("pointercancel", () => {
    from = null;
    show(box, false);
  });
  ground.addEventListener("pointerleave", () => surface.hover(null));
  ground.addEventListener("dblclick", () => {
    surface.view.fit();
    surface.changed();
  });
}

function drawBox(/** @type {SVGElement} */ box, /** @type {Surface} */ surface, /** @type {number} */ from, /** @type {number} */ to) {
  const { start, end } = surface.scale();
  const [a, b] = [from, to].map((x) => Math.max(start, Math.min(end, x))).sort((one, other) => one - other);
  const plots = surface.plots();
  show(box, b - a >= LEAST_BOX_PX);
  set(box, { x: a, width: b - a, y: plots[0].top, height: plots[plots.length - 1].bottom - plots[0].top });
}

function toRange(/** @type {Surface} */ surface, /** @type {number} */ value) {
  return surface.logarithmic ? Math.log10(value) : value;
}

/** Inside the limits, and never so narrow that ticks lose their meaning. @returns {[number, number]} */
function limited(/** @type {[number, number]} */ [from, to], /** @type {[number, number]} */ [least, most]) {
  const narrowest = (most - least) / 400;
  const middle = (from + to) / 2;
  const half = Math.max(to - from, narrowest) / 2;
  return [Math.max(least, middle - half), Math.min(most, middle + half)];
}
