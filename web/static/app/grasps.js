/** What each handle of the loop chart does: the grasps of corners, bars, dampings, notches, gain and crossover. */

import { cornersOf, dampingsOf, LEAST_RAD_S, MOST_RAD_S, movedTogether, notchesOf, withGainOf } from "./corners.js";
import { exact, frequency, number } from "./format.js";
import { logarithmic } from "./handle.js";
import { fromShown, toShown } from "./units.js";

/** @typedef {import("./handle.js").Grasp} Grasp */
/** @typedef {import("./scene.js").Scene} Scene */
/** @typedef {{x: number, y: number}} Point */

/** Typed in the unit shown. @param {Scene} scene */
const inShownUnit = (scene) => ({
  typed: (/** @type {number} */ rad_s) => exact(toShown(rad_s, scene.unit)),
  read: (/** @type {number} */ shown) => fromShown(shown, scene.unit),
});

/** @param {Scene} scene */
const alongFrequency = (scene) => ({
  dragged: logarithmic.dragged(() => scene.x.perUnit),
  stepped: logarithmic.stepped,
  ends: () => /** @type {[number, number]} */ ([
    Math.max(LEAST_RAD_S, scene.x.value(scene.x.start)), Math.min(MOST_RAD_S, scene.x.value(scene.x.end)),
  ]),
  ...inShownUnit(scene),
});

/** @param {Scene} scene @param {string} id @param {() => Point} at @returns {Grasp} */
export function cornerGrasp(scene, id, at) {
  const corner = () => /** @type {import("./corners.js").Corner} */ (cornersOf(scene.design).find((one) => one.id === id));
  return {
    name: () => corner().name,
    value: () => corner().rad_s,
    text: () => frequency(corner().rad_s, scene.unit),
    set: (design, rad_s) => corner().set(design, rad_s),
    at, stage: corner().stage, ...alongFrequency(scene),
  };
}

/** The bar between o and x: both move, their ratio stays. @param {Scene} scene @param {number} stage
 *  @param {() => Point} at @returns {Grasp} */
export function barGrasp(scene, stage, at) {
  const of = () => scene.design.compensator.stages[stage];
  return {
    name: () => `${scene.nameOf(stage)}, both corners`,
    value: () => of().zero_rad_s,
    text: () => `${number(toShown(of().zero_rad_s, scene.unit))} to ${frequency(of().pole_rad_s, scene.unit)}`,
    set: (design, rad_s) => movedTogether(design, stage, rad_s),
    at, stage, ...alongFrequency(scene),
  };
}

/** @param {Scene} scene @param {string} id @param {() => Point} at @param {number} pxPerDecade of damping
 *  @param {() => boolean} upwards which way the stem stands @returns {Grasp} */
export function dampingGrasp(scene, id, at, pxPerDecade, upwards) {
  const damping = () => /** @type {import("./corners.js").Shape} */ (dampingsOf(scene.design).find((one) => one.id === id));
  return {
    name: () => damping().name,
    value: () => damping().value,
    text: () => `damping ${number(damping().value)}`,
    ends: () => [damping().least, damping().most],
    dragged: (start, _dx, dy) => Math.min(2, Math.max(1e-4, start * 10 ** ((upwards() ? -dy : dy) / pxPerDecade))),
    stepped: logarithmic.stepped,
    set: (design, value) => damping().set(design, value),
    at, stage: damping().stage,
  };
}

/** The arm of a notch, pulled outwards: it stands where the notch takes 3 dB, w·(√(1+ζ²) ± ζ), so its distance in
 *  ln ω is asinh ζ. @param {Scene} scene @param {number} stage @param {1 | -1} side @param {() => Point} at
 *  @returns {Grasp} */
export function widthGrasp(scene, stage, side, at) {
  const width = () => /** @type {any} */ (notchesOf(scene.design).find((one) => one.stage === stage)).width;
  const pxPerNeper = () => scene.x.perUnit / Math.LN10;
  return {
    name: () => width().name,
    value: () => width().value,
    text: () => `pole damping ${number(width().value)}`,
    ends: () => [width().least, width().most],
    dragged: (start, dx) => Math.sinh(Math.max(0.004, Math.asinh(start) + (side * dx) / pxPerNeper())),
    stepped: logarithmic.stepped,
    set: (design, value) => width().set(design, value),
    at, stage,
  };
}

/** The point of a notch, pulled down: deeper. @param {Scene} scene @param {number} stage @param {() => Point} at
 *  @returns {Grasp} */
export function depthGrasp(scene, stage, at) {
  const depth = () => /** @type {any} */ (notchesOf(scene.design).find((one) => one.stage === stage)).depth;
  return {
    name: () => depth().name,
    value: () => depth().value,
    text: () => `${number(depth().value)} dB deep`,
    ends: () => [depth().least, depth().most],
    dragged: (start, _dx, dy) => Math.max(0, start + dy / Math.abs(scene.gain.perUnit)),
    stepped: (value, steps) => value + steps / 10,
    set: (design, value) => depth().set(design, value),
    at, stage,
  };
}

/** The gain lane has a scale of its own; a decade of gain is as long as `pxPerDecade`. @param {Scene} scene
 *  @param {() => number} pxPerDecade @param {() => [number, number]} ends magnitudes @param {() => Point} at
 *  @returns {Grasp} */
export function gainGrasp(scene, pxPerDecade, ends, at) {
  const gain = () => scene.design.compensator.gain;
  const sign = () => Math.sign(gain()) || 1;
  return {
    name: () => "gain",
    value: () => Math.abs(gain()),
    text: () => number(gain()),
    ends,
    dragged: logarithmic.dragged(pxPerDecade),
    stepped: logarithmic.stepped,
    set: (design, size) => withGainOf(design, sign() * size),
    typed: (size) => exact(sign() * size),
    // Typing may turn the sign; the lane never does.
    keep: withGainOf,
    refuse: (shown) => (shown === 0 ? "must not be 0: the loop would be open" : null),
    at, stage: "gain",
  };
}

/** Choose the crossover; the server sets the gain that puts it there. @param {Scene} scene
 *  @param {() => number} crossover_rad_s @param {() => Point} at @returns {Grasp} */
export function crossoverGrasp(scene, crossover_rad_s, at) {
  return {
    name: () => "crossover, by the gain",
    value: crossover_rad_s,
    text: () => frequency(crossover_rad_s(), scene.unit),
    set: (design) => design,
    aim: (rad_s) => ({ crossover_rad_s: rad_s }),
    at, stage: "gain", ...alongFrequency(scene),
  };
}
