/**
 * The corner rail: a gain lane and one lane a stage, on the frequency axis of the charts above. o and x are the
 * handles, the bar between them moves both. Where a lane has nothing to hold, it says why.
 */

import { cornersOf, isAwake } from "./corners.js";
import { number, tick as tickText } from "./format.js";
import { glyph } from "./glyphs.js";
import { barGrasp, cornerGrasp, gainGrasp } from "./grasps.js";
import { handle } from "./handle.js";
import { keyed } from "./keyed.js";
import { frequencyTicks } from "./scales.js";
import { set, show, svg, textWidth } from "./svg.js";

/** @typedef {import("./scene.js").Scene} Scene */
/** @typedef {import("./handle.js").Hand} Hand */

const GAIN_DECADES = 4;

/** @param {SVGElement} parent @param {Scene} scene @param {Hand} hand */
export function rail(parent, scene, hand) {
  const gainLane = makeGainLane(scene, hand);
  parent.append(gainLane.node);
  const drawLanes = keyed(parent, (/** @type {any} */ item) => item.key, (item) => makeLane(scene, hand, item.index), (part) => part.draw());
  const drawTicks = keyed(parent, (/** @type {any} */ item) => item.key, () => ({ node: svg("text", { class: "tick", "text-anchor": "middle" }) }),
    (part, item) => set(part.node, { x: item.x, y: scene.geometry.ticksAt, text: item.text }));
  const unit = svg("text", { class: "tick unit", "text-anchor": "end" });
  parent.append(unit);

  return {
    draw() {
      const stages = scene.design.compensator.stages ?? [];
      gainLane.draw();
      drawLanes(stages.map((/** @type {any} */ stage, /** @type {number} */ index) => ({ index, key: `lane ${index} ${stage.kind}` })));
      const unitWidth = textWidth(scene.unit, 11) + 14;
      const ticks = frequencyTicks([scene.x.from, scene.x.to], scene.unit)
        .map((one) => ({ key: `tick ${one.shown}`, x: scene.x.px(one.rad_s), text: tickText(one.shown) }))
        .filter((one) => one.x < scene.x.end - unitWidth);
      drawTicks(ticks);
      set(unit, { x: scene.x.end, y: scene.geometry.ticksAt, text: scene.unit });
    },
  };
}

/** What every lane has: its ground, its name at the left, room for stretches under the handles. */
function laneGround(/** @type {string} */ extra) {
  const ground = svg("rect", { class: "lane", rx: 3 });
  const name = svg("text", { class: "lane-name", "text-anchor": "end" });
  const full = svg("title");
  const note = svg("text", { class: "lane-note" });
  const node = svg("g", { class: `lane-group ${extra}` }, ground, name, note);
  return {
    node, note,
    place(/** @type {Scene} */ scene, /** @type {{top: number, bottom: number, middle: number}} */ lane, /** @type {string} */ text) {
      const { left, right } = scene.geometry;
      set(ground, { x: left, y: lane.top, width: Math.max(0, right - left), height: lane.bottom - lane.top });
      set(name, { x: left - 10, y: lane.middle + 4, text: shortened(text, left - 16) });
      if (name.textContent !== text) {
        full.textContent = text;
        name.append(full);
      }
      set(note, { x: right - 10, y: lane.middle + 4, "text-anchor": "end" });
    },
  };
}

function shortened(/** @type {string} */ text, /** @type {number} */ room) {
  if (textWidth(text, 12) <= room) return text;
  let end = text.length;
  while (end > 1 && textWidth(`${text.slice(0, end)}…`, 12) > room) end -= 1;
  return `${text.slice(0, end).trimEnd()}…`;
}

function makeLane(/** @type {Scene} */ scene, /** @type {Hand} */ hand, /** @type {number} */ index) {
  const base = laneGround("");
  const lane = () => scene.geometry.lanes[index + 1];
  const bars = svg("g");
  const marks = svg("g");
  base.node.append(bars, marks);
  light(base.node, scene, index);
  const bar = makeBar(scene, hand, index, lane);
  bars.append(bar.node);
  const drawHandles = keyed(marks, (/** @type {any} */ corner) => `${corner.id} ${corner.kind}`,
    (corner) => {
      const place = { x: 0, y: 0 };
      const made = handle(hand, cornerGrasp(scene, corner.id, () => place), { class: `rail-handle ${corner.kind}`, where: "on the rail" }, svg("circle", { class: "glow", r: 13 }), glyph(corner.kind));
      return { ...made, place };
    },
    (part, corner) => {
      part.place.x = scene.x.px(corner.rad_s);
      part.place.y = lane().middle;
      set(part.node, { transform: `translate(${part.place.x.toFixed(1)} ${part.place.y})` });
      part.speak();
    });
  const drawFixed = keyed(marks, (/** @type {any} */ item) => item.key, (item) => ({ node: svg("g", { class: "fixed" }, glyph(item.kind)) }),
    (part, item) => set(part.node, { transform: `translate(${scene.x.px(item.rad_s).toFixed(1)} ${lane().middle})` }));

  return {
    node: base.node,
    draw() {
      const stage = scene.design.compensator.stages[index];
      const corners = cornersOf(scene.design).filter((corner) => corner.stage === index);
      base.place(scene, lane(), scene.nameOf(index));
      base.node.classList.toggle("is-resting", !isAwake(stage));
      base.node.classList.toggle("is-lit", scene.store.ui.focusedStage === index);
      bar.draw(stage);
      drawHandles(corners.filter((corner) => scene.inSight(corner.rad_s)));
      drawFixed(fixedRoots(stage).filter((root) => scene.inSight(root.rad_s)));
      set(base.note, { text: laneNote(scene, stage, corners) });
    },
  };
}

function makeBar(/** @type {Scene} */ scene, /** @type {Hand} */ hand, /** @type {number} */ index,
  /** @type {() => {top: number, bottom: number, middle: number}} */ lane) {
  const line = svg("path", { class: "bar" });
  const place = { x: 0, y: 0 };
  const reach = svg("path", { class: "bar-reach" });
  const isPair = scene.design.compensator.stages[index].kind === "lead_lag";
  const grip = isPair ? handle(hand, barGrasp(scene, index, () => place), { class: "bar-handle", reach: null }, reach, line) : null;
  const node = grip?.node ?? svg("g", {}, line);
  return {
    node,
    draw(/** @type {any} */ stage) {
      const ends = barEnds(scene, stage);
      show(node, ends !== null);
      if (!ends) return;
      const [from, to] = ends.map((x) => Math.max(scene.x.start, Math.min(scene.x.end, x)));
      const y = lane().middle;
      place.x = (from + to) / 2;
      place.y = y;
      const room = Math.max(0, Math.min(11, (to - from) / 2 - 1));
      set(line, { d: `M${from} ${y}H${to}` });
      set(reach, { d: `M${from + room} ${y}H${to - room}` });
      grip?.speak();
    },
  };
}

/** Between the corners of a pair; from the low end for an integrator; across its 3 dB width for a notch. */
function barEnds(/** @type {Scene} */ scene, /** @type {any} */ stage) {
  if (stage.kind === "lead_lag") return [scene.x.px(stage.zero_rad_s), scene.x.px(stage.pole_rad_s)].sort((a, b) => a - b);
  if (stage.kind === "proportional_integral") return [scene.x.start, scene.x.px(stage.corner_rad_s)];
  if (stage.kind === "integrator") return [scene.x.start, scene.x.start + 18];
  if (stage.kind === "notch") {
    const half = (Math.asinh(stage.pole_damping) / Math.LN10) * scene.x.perUnit;
    const centre = scene.x.px(stage.centre_rad_s);
    return [centre - half, centre + half];
  }
  return null;
}

/** Corners of a stage given as roots: shown, not held. */
function fixedRoots(/** @type {any} */ stage) {
  if (stage.kind !== "rational") return [];
  const marks = (/** @type {any[]} */ roots, /** @type {string} */ one, /** @type {string} */ pair) => roots
    .map((root) => (Array.isArray(root) ? root : [root, 0]))
    .filter(([, im]) => im >= 0)
    .map(([re, im], at) => ({ key: `fixed ${one} ${at}`, kind: im > 0 ? pair : one, rad_s: Math.hypot(re, im) }));
  return [...marks(stage.zeros ?? [], "o", "oo"), ...marks(stage.poles ?? [], "x", "xx")];
}

function laneNote(/** @type {Scene} */ scene, /** @type {any} */ stage, /** @type {import("./corners.js").Corner[]} */ corners) {
  if (!isAwake(stage)) return "resting";
  if (stage.kind === "integrator") return "pole at zero frequency: nothing to move";
  const hidden = corners.filter((corner) => !scene.inSight(corner.rad_s));
  if (hidden.length === 0) return "";
  const low = hidden.filter((corner) => corner.rad_s < scene.x.value(scene.x.start));
  const high = hidden.filter((corner) => !low.includes(corner));
  const named = (/** @type {any[]} */ some) => some.map((corner) => corner.short).join(", ");
  return [low.length ? `◂ ${named(low)} below what is shown` : "", high.length ? `${named(high)} above what is shown ▸` : ""].filter(Boolean).join("   ");
}

/** Rail, ledger, markers and drawer light a stage up together. */
function light(/** @type {Element} */ node, /** @type {Scene} */ scene, /** @type {number | "gain"} */ stage) {
  node.addEventListener("pointerenter", () => scene.store.setUi({ focusedStage: stage }));
  node.addEventListener("pointerleave", () => scene.store.setUi({ focusedStage: null }));
}

/** A scale of its own, four decades about the gain, renewed when the hand has come near an end. */
function makeGainLane(/** @type {Scene} */ scene, /** @type {Hand} */ hand) {
  const base = laneGround("gain-lane");
  const marks = svg("g");
  const place = { x: 0, y: 0 };
  let middle = NaN;
  const size = () => Math.log10(Math.abs(scene.design.compensator.gain));
  const perDecade = () => (scene.x.end - scene.x.start) / GAIN_DECADES;
  const px = (/** @type {number} */ exponent) => scene.x.start + (exponent - middle + GAIN_DECADES / 2) * perDecade();
  const ends = () => /** @type {[number, number]} */ ([10 ** (middle - GAIN_DECADES / 2), 10 ** (middle + GAIN_DECADES / 2)]);
  const grip = handle(hand, gainGrasp(scene, perDecade, ends, () => place), { class: "gain-handle" },
    svg("circle", { class: "glow", r: 13 }), svg("rect", { class: "gain-knob", x: -5, y: -10, width: 10, height: 20, rx: 4 }), svg("path", { class: "gain-line", d: "M0 -5V5" }));
  base.node.append(marks, grip.node);
  light(base.node, scene, "gain");
  const drawMarks = keyed(marks, (/** @type {any} */ item) => item.key,
    (item) => ({ node: svg("text", { class: "gain-tick", "text-anchor": "middle", text: item.text }) }),
    (part, item) => {
      set(part.node, { x: px(item.exponent), y: scene.geometry.lanes[0].middle + 4 });
      show(part.node, Math.abs(px(item.exponent) - place.x) > 26 && px(item.exponent) < scene.x.end - 14 && px(item.exponent) > scene.x.start + 14);
    });

  return {
    node: base.node,
    draw() {
      const lane = scene.geometry.lanes[0];
      if (!(Math.abs(size() - middle) < GAIN_DECADES / 2 - 0.25) && !(scene.store.holding && Number.isFinite(middle))) middle = Math.round(size());
      base.place(scene, lane, "gain");
      base.node.classList.toggle("is-lit", /** @type {any} */ (scene.store.ui.focusedStage) === "gain");
      place.x = Math.max(scene.x.start, Math.min(scene.x.end, px(size())));
      place.y = lane.middle;
      const first = Math.ceil(middle - GAIN_DECADES / 2 + 0.1);
      drawMarks(Array.from({ length: GAIN_DECADES }, (_, at) => ({ key: `gain ${first + at}`, exponent: first + at, text: number(10 ** (first + at), 1) })));
      set(grip.node, { transform: `translate(${place.x.toFixed(1)} ${place.y})` });
      grip.speak();
    },
  };
}
