/** The loop over frequency: gain and phase with everything that can be held, and the rail below them. */

import { curveKey } from "./curve_key.js";
import { changeInWords, flag } from "./flag.js";
import { number } from "./format.js";
import { chartGeometry } from "./geometry.js";
import { crossoverGrip } from "./grip.js";
import { boxesAlong } from "./labels.js";
import { loopPicture } from "./loop_picture.js";
import { LoopRanges } from "./loop_ranges.js";
import { markedRow } from "./marked.js";
import { markLayer } from "./mark_layer.js";
import { markers } from "./markers.js";
import { onNextFrame } from "./paint.js";
import { pictureKey, pictureStage } from "./picture_stage.js";
import { rail } from "./rail.js";
import { readingFlag } from "./reading_flag.js";
import { limitFences } from "./limit_fences.js";
import { Scene } from "./scene.js";
import { unstableWords } from "./stability_words.js";
import { zoomSurface } from "./surface.js";
import { set, show, svg } from "./svg.js";
import { toShown } from "./units.js";
import { typingField } from "./typing.js";
import { zoomWords } from "./zoom_words.js";

/** @typedef {import("./handle.js").Grasp} Grasp */

/** @param {HTMLElement} root @param {import("./store.js").Store} store @param {any} pace */
export function charts(root, store, pace) {
  const stage = pictureStage(root, store, "Loop gain and phase over frequency", () => paint());
  const scene = new Scene(store);
  const ranges = new LoopRanges(store);
  const lit = { grasp: /** @type {Grasp | null} */ (null), how: "none" };
  const paint = onNextFrame(draw);
  const hand = {
    store, pace, type: typingField(stage.node, store),
    light: (/** @type {Grasp | null} */ grasp, /** @type {"held" | "near" | "none"} */ how) => {
      if (store.holding && how !== "held" && lit.how === "held") return;
      lit.grasp = how === "none" ? null : grasp;
      lit.how = how;
      store.setUi({ focusedStage: how === "none" ? null : grasp?.stage ?? null });
      paint();
    },
  };
  const layers = makeLayers(stage.overlay, scene, hand, ranges, paint);
  const words = zoomWords(ranges.view, paint, "frequencies");
  stage.node.append(words.node);

  for (const type of ["design", "frame", "ui", "pinned", "holding", "connection", "theme"]) store.addEventListener(type, paint);
  store.addEventListener("loaded", () => ranges.startAnew());

  function draw() {
    if (!store.design || !store.lastGood || !stage.size.width) return stage.node.classList.add("is-empty");
    stage.node.classList.remove("is-empty");
    const lanes = (store.design.compensator.stages ?? []).length + 1;
    const geometry = chartGeometry(stage.size.width, stage.size.height, lanes);
    ranges.follow(stage.frozen);
    scene.renew(geometry, ranges.now());
    const picture = loopPicture(store, geometry, ranges.now());
    stage.draw(picture, pictureKey(store, picture, markedRow(store)?.caseIndex));
    stage.dress(geometry.width, geometry.height, () => summary(store));
    layers.draw(lit, stage.frozen);
    words.place(8, geometry.railBottom + 4);
    return undefined;
  }
}

function makeLayers(/** @type {SVGElement} */ overlay, /** @type {Scene} */ scene, /** @type {any} */ hand, /** @type {LoopRanges} */ ranges,
  /** @type {() => void} */ paint) {
  const group = (/** @type {string} */ name) => {
    const node = svg("g", { class: name });
    overlay.append(node);
    return node;
  };
  const hover = { place: /** @type {{x: number, y: number} | null} */ (null) };
  const surface = zoomSurface({
    node: overlay, view: ranges.view, logarithmic: true, changed: paint, scale: () => scene.x,
    plots: () => [scene.geometry.gain, scene.geometry.phase], limits: () => ranges.limits(),
    hover: (place) => {
      hover.place = place;
      paint();
    },
  });
  const titles = chartTitles(group("titles"));
  const key = curveKey(group("curve-key"), scene.store);
  const fences = limitFences(group("fences"), scene);
  const guides = group("guides");
  const guide = svg("path", { class: "guide" });
  guides.append(guide);
  const bars = group("marks");
  const corners = markers(group("markers"), scene, hand);
  const grip = crossoverGrip(group("grips"), scene, hand);
  const lanes = rail(group("rail"), scene, hand);
  const marks = markLayer(bars, group("mark-labels"), scene);
  const reading = readingFlag(group("readings"));
  const pennant = flag(group("flags"));

  return {
    draw(/** @type {{grasp: Grasp | null, how: string}} */ lit, /** @type {boolean} */ frozen) {
      surface.draw();
      titles.draw(scene);
      key.draw(scene.geometry.right, scene.geometry.gain.top - 10, scene.geometry.right - scene.geometry.left - 110);
      fences.draw();
      lanes.draw();
      corners.draw();
      grip.draw();
      const obstacles = [...corners.boxes(), ...grip.boxes()];
      const flagBox = drawFlag(pennant, scene, lit, frozen, obstacles);
      marks.draw(flagBox ? [...obstacles, flagBox] : obstacles);
      drawGuide(guide, scene, lit);
      drawReading(reading, scene, hover.place, lit);
    },
  };
}

function chartTitles(/** @type {SVGElement} */ parent) {
  const make = (/** @type {string} */ name, /** @type {string} */ unit) => {
    const node = svg("text", { class: "plot-title" }, svg("tspan", { class: "plot-name", text: name }), svg("tspan", { class: "plot-unit", dx: 5, text: unit }));
    parent.append(node);
    return node;
  };
  const gain = make("loop gain", "dB");
  const phase = make("loop phase", "degrees");
  const unstable = svg("text", { class: "unstable" });
  parent.append(unstable);
  return {
    draw(/** @type {Scene} */ scene) {
      const { left, right, gain: upper, phase: lower } = scene.geometry;
      set(gain, { x: left, y: upper.top - 10 });
      set(phase, { x: left, y: lower.top - 10 });
      set(unstable, { x: left + 10, y: upper.bottom - 12, text: unstableWords(scene.frame.assessment.cases, right - left - 20) });
    },
  };
}

function drawFlag(/** @type {any} */ pennant, /** @type {Scene} */ scene, /** @type {{grasp: Grasp | null, how: string}} */ lit,
  /** @type {boolean} */ frozen, /** @type {import("./labels.js").Box[]} */ obstacles) {
  const grasp = lit.grasp;
  const alive = grasp && (typeof grasp.stage !== "number" || scene.design.compensator.stages[grasp.stage]);
  if (!alive) {
    pennant.hide();
    return null;
  }
  const { left, right, gain, phase, railBottom } = scene.geometry;
  const [top, bottom] = grasp.at().y <= gain.bottom ? [gain.top, gain.bottom] : [phase.top, railBottom];
  const within = { x: left + 2, y: top + 2, width: right - left - 4, height: bottom - top - 4 };
  const curve = boxesAlong((px) => scene.gain.px(scene.read("magnitude_db", scene.x.value(px))), scene.x.start, scene.x.end, 10);
  const content = { name: grasp.name(), value: grasp.text(), change: frozen || lit.how === "held" ? changeInWords(scene.store) : "", ...grasp.at() };
  return pennant.draw(content, within, [...obstacles, ...curve]);
}

/** A thin line from the corner through both charts to its lane. */
function drawGuide(/** @type {SVGElement} */ guide, /** @type {Scene} */ scene, /** @type {{grasp: Grasp | null}} */ { grasp }) {
  const corners = /** @type {any[]} */ (grasp && typeof grasp.stage === "number" ? [scene.design.compensator.stages[grasp.stage]] : []);
  const places = corners.filter(Boolean).flatMap((stage) => ["zero_rad_s", "pole_rad_s", "corner_rad_s", "natural_rad_s", "centre_rad_s"].map((field) => stage[field]))
    .filter((rad_s) => rad_s > 0 && scene.inSight(rad_s));
  show(guide, places.length > 0);
  const bottom = scene.geometry.lanes[Number(grasp?.stage) + 1]?.middle ?? scene.geometry.railTop;
  set(guide, { d: places.map((rad_s) => `M${scene.x.px(rad_s).toFixed(1)} ${scene.onCurve(rad_s).toFixed(1)}V${bottom}`).join("") });
}

function drawReading(/** @type {any} */ reading, /** @type {Scene} */ scene, /** @type {{x: number, y: number} | null} */ place,
  /** @type {{grasp: Grasp | null}} */ { grasp }) {
  if (!place || grasp || scene.store.holding) return reading.hide();
  const rad_s = scene.x.value(place.x);
  const gain = scene.read("magnitude_db", rad_s);
  if (!Number.isFinite(gain)) return reading.hide();
  const cases = scene.frame.assessment.cases;
  const line = (/** @type {number} */ index, /** @type {string} */ kind) => ({
    kind, text: `${cases[index].name}  ${number(scene.read("magnitude_db", rad_s, index))} dB, ${number(scene.read("phase_deg", rad_s, index), 4)}°`,
  });
  const worst = markedRow(scene.store)?.caseIndex ?? 0;
  const head = { kind: "head", text: `${number(toShown(rad_s, scene.unit))} ${scene.unit}` };
  const { left, right, gain: { top }, phase: { bottom } } = scene.geometry;
  reading.draw(place, [head, line(0, "nominal"), ...(worst > 0 ? [line(worst, "worst")] : [])], { left, right, top, bottom });
  return undefined;
}

function summary(/** @type {import("./store.js").Store} */ store) {
  const [nominal] = store.lastGood?.assessment.cases ?? [];
  const said = (/** @type {string} */ measure, /** @type {string} */ unit) => {
    const reading = nominal?.readings[measure];
    return reading?.state === "value" ? `${number(reading.value)} ${unit}` : reading?.state ?? "unknown";
  };
  return `Loop gain and phase over frequency. ${nominal?.name ?? "Nominal"}: crossover ${said("crossover_rad_s", "rad/s")}, phase margin ${said("phase_margin_deg", "degrees")}, gain margin ${said("gain_margin_db", "dB")}.`;
}
