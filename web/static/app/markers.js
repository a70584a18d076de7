/** The markers on the gain curve: draggable echoes of the rail's handles, with damping stems and notch chevrons. */

import { cornersOf, dampingsOf, notchesOf } from "./corners.js";
import { glyph } from "./glyphs.js";
import { cornerGrasp, dampingGrasp, depthGrasp, widthGrasp } from "./grasps.js";
import { handle } from "./handle.js";
import { keyed } from "./keyed.js";
import { set, svg } from "./svg.js";

/** @typedef {import("./corners.js").Corner} Corner */

const APART_PX = 23;
const LIFT_PX = 27;
const STEM_PX = [20, 76];
const STEM_PX_PER_DECADE = 12;
const ARM_PX = [15, 140];
const CHEVRON_PX = [16, 64];

/** @param {SVGElement} parent @param {import("./scene.js").Scene} scene @param {import("./handle.js").Hand} hand */
export function markers(parent, scene, hand) {
  let knobs = /** @type {{x: number, y: number}[]} */ ([]);
  let places = /** @type {Map<string, {x: number, y: number}>} */ (new Map());
  const at = (/** @type {string} */ id) => places.get(id) ?? { x: 0, y: 0 };

  const drawLeaders = keyed(parent, (/** @type {any} */ item) => item.id,
    () => ({ node: svg("path", { class: "leader" }) }),
    (part, item) => set(part.node, { d: `M${item.x} ${item.y}V${item.curveY}` }));
  const drawStems = stems(parent, scene, hand, at);
  const drawChevrons = chevrons(parent, scene, hand, at);
  const drawCorners = keyed(parent, (/** @type {Corner} */ corner) => `${corner.id} ${corner.kind}`,
    (corner) => handle(hand, cornerGrasp(scene, corner.id, () => at(corner.id)), { class: `marker ${corner.kind}` }, glow(), glyph(corner.kind)),
    (part, corner) => {
      const { x, y } = at(corner.id);
      set(part.node, { transform: `translate(${x.toFixed(1)} ${y.toFixed(1)})` });
      part.node.classList.toggle("is-lit", scene.store.ui.focusedStage === corner.stage);
      part.speak();
    });

  return {
    draw() {
      const corners = cornersOf(scene.design).filter((corner) => corner.enabled && scene.inSight(corner.rad_s));
      const standing = standingPlaces(scene, corners);
      places = new Map(standing.map((place) => [place.id, place]));
      drawLeaders(standing.filter((place) => place.lifted));
      const tips = [...drawStems(corners.filter((corner) => corner.kind === "oo" || corner.kind === "xx")).values()].map(({ tip }) => tip.now);
      const arms = [...drawChevrons(corners.filter((corner) => corner.kind === "notch")).values()].flatMap(({ now: { shape } }) => [
        { x: shape.x - shape.arm, y: shape.top }, { x: shape.x + shape.arm, y: shape.top }, { x: shape.x, y: shape.point },
      ]);
      knobs = [...tips, ...arms];
      drawCorners(corners);
    },
    /** What labels keep clear of. @returns {import("./labels.js").Box[]} */
    boxes: () => [...[...places.values()].map(({ x, y }) => boxAbout(x, y, 13)), ...knobs.map(({ x, y }) => boxAbout(x, y, 9))],
  };
}

function boxAbout(/** @type {number} */ x, /** @type {number} */ y, /** @type {number} */ half) {
  return { x: x - half, y: y - half, width: 2 * half, height: 2 * half };
}

function glow() {
  return svg("circle", { class: "glow", r: 13 });
}

/** On the curve; where two would cover each other, the later one is lifted off it. */
function standingPlaces(/** @type {import("./scene.js").Scene} */ scene, /** @type {Corner[]} */ corners) {
  const { top } = scene.geometry.gain;
  const placed = /** @type {{id: string, x: number, y: number, curveY: number, lifted: boolean}[]} */ ([]);
  for (const corner of corners) {
    const x = scene.x.px(corner.rad_s);
    const curveY = scene.onCurve(corner.rad_s);
    let y = curveY;
    const clash = () => placed.find((other) => Math.hypot(other.x - x, other.y - y) < APART_PX);
    const up = curveY - LIFT_PX * 3 > top ? -1 : 1;
    for (let turn = 1; clash() && turn < 6; turn += 1) y = curveY + up * LIFT_PX * turn;
    placed.push({ id: corner.id, x, y, curveY, lifted: y !== curveY });
  }
  return placed;
}

function stems(/** @type {SVGElement} */ parent, /** @type {import("./scene.js").Scene} */ scene, /** @type {import("./handle.js").Hand} */ hand,
  /** @type {(id: string) => {x: number, y: number}} */ at) {
  const tipOf = (/** @type {Corner} */ corner) => {
    const { x, y } = at(corner.id);
    const damping = dampingsOf(scene.design).find((one) => one.stage === corner.stage)?.value ?? 1;
    const long = STEM_PX[0] + STEM_PX_PER_DECADE * (Math.log10(damping) + 4);
    const length = Math.max(STEM_PX[0], Math.min(STEM_PX[1], long));
    const up = y - length > scene.geometry.gain.top + 6;
    return { x, y: up ? y - length : y + length, up };
  };
  return keyed(parent, (/** @type {Corner} */ corner) => `${corner.id} stem`,
    (corner) => {
      const line = svg("path", { class: "stem" });
      const tip = { now: tipOf(corner) };
      const grasp = dampingGrasp(scene, `${corner.stage}.damping`, () => tip.now, STEM_PX_PER_DECADE, () => tip.now.up);
      const grip = handle(hand, grasp, { class: "stem-tip", orientation: "vertical", reach: 12 }, svg("path", { class: "stroke", d: "M-6 0H6" }));
      return { node: svg("g", {}, line, grip.node), line, grip, tip };
    },
    (part, corner) => {
      const { x, y } = at(corner.id);
      part.tip.now = tipOf(corner);
      set(part.line, { d: `M${x} ${part.tip.now.up ? y - 12 : y + 12}V${part.tip.now.y}` });
      set(part.grip.node, { transform: `translate(${x} ${part.tip.now.y})` });
      part.grip.speak();
    });
}

function chevrons(/** @type {SVGElement} */ parent, /** @type {import("./scene.js").Scene} */ scene, /** @type {import("./handle.js").Hand} */ hand,
  /** @type {(id: string) => {x: number, y: number}} */ at) {
  const shapeOf = (/** @type {Corner} */ corner) => {
    const { x, y } = at(corner.id);
    const notch = /** @type {any} */ (notchesOf(scene.design).find((one) => one.stage === corner.stage));
    const arm = between(ARM_PX, (Math.asinh(notch.width.value) / Math.LN10) * scene.x.perUnit);
    const rise = between(CHEVRON_PX, notch.depth.value * Math.abs(scene.gain.perUnit));
    return { x, y, arm, top: y - rise, point: y + 20 };
  };
  return keyed(parent, (/** @type {Corner} */ corner) => `${corner.id} chevron`,
    (corner) => {
      const now = { shape: shapeOf(corner) };
      const line = svg("path", { class: "chevron" });
      const left = handle(hand, widthGrasp(scene, corner.stage, -1, () => ({ x: now.shape.x - now.shape.arm, y: now.shape.top })), { class: "arm", reach: 12, where: "left arm" }, knob());
      const right = handle(hand, widthGrasp(scene, corner.stage, 1, () => ({ x: now.shape.x + now.shape.arm, y: now.shape.top })), { class: "arm", reach: 12, where: "right arm" }, knob());
      const point = handle(hand, depthGrasp(scene, corner.stage, () => ({ x: now.shape.x, y: now.shape.point })),
        { class: "point", orientation: "vertical", reach: 12 }, knob());
      return { node: svg("g", {}, line, left.node, right.node, point.node), line, left, right, point, now };
    },
    (part, corner) => {
      const shape = shapeOf(corner);
      part.now.shape = shape;
      const { x, y, arm, top, point } = shape;
      set(part.line, { d: `M${x - arm} ${top}L${x} ${y}L${x + arm} ${top}M${x} ${y + 11}V${point}` });
      set(part.left.node, { transform: `translate(${x - arm} ${top})` });
      set(part.right.node, { transform: `translate(${x + arm} ${top})` });
      set(part.point.node, { transform: `translate(${x} ${point})` });
      for (const part_ of [part.left, part.right, part.point]) part_.speak();
    });
}

function knob() {
  return svg("circle", { class: "knob", r: 3.5 });
}

function between(/** @type {number[]} */ [least, most], /** @type {number} */ value) {
  return Math.max(least, Math.min(most, value));
}
