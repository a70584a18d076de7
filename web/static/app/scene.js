/**
 * Everything the layers of the loop chart need for one drawing: the design, the newest curves, where things
 * stand. One object for the page's life; its fields are renewed before each drawing.
 */

import { curveOf, valueAt } from "./envelope.js";
import { linearScale, logScale } from "./scales.js";
import { stageName } from "./stages_words.js";

export class Scene {
  /** @type {any} */ frame = null;
  /** @type {import("./geometry.js").Geometry} */ geometry;
  /** @type {import("./units.js").FrequencyUnit} */ unit = "rad/s";
  /** @type {import("./scales.js").Scale} */ x;
  /** @type {import("./scales.js").Scale} */ gain;
  /** @type {import("./scales.js").Scale} */ phase;

  /** @param {import("./store.js").Store} store */
  constructor(store) {
    this.store = store;
  }

  /** Always the newest: two key presses may come between two drawings. @returns {any} */
  get design() {
    return this.store.design;
  }

  /** @param {import("./geometry.js").Geometry} geometry
   *  @param {{x: [number, number], gain: [number, number], phase: [number, number]}} ranges */
  renew(geometry, ranges) {
    this.frame = this.store.lastGood;
    this.unit = this.store.ui.unit;
    this.geometry = geometry;
    this.x = logScale(ranges.x, geometry.left, geometry.right);
    this.gain = linearScale(ranges.gain, geometry.gain.bottom, geometry.gain.top);
    this.phase = linearScale(ranges.phase, geometry.phase.bottom, geometry.phase.top);
  }

  /** One case's curve at a frequency. @param {"magnitude_db" | "phase_deg"} name @param {number} rad_s
   *  @param {number} [caseIndex] */
  read(name, rad_s, caseIndex = 0) {
    const { omega_rad_s, [name]: array } = this.frame.arrays;
    return valueAt(omega_rad_s.data, curveOf(array, caseIndex), rad_s, true);
  }

  /** Height in px of the nominal gain curve at a frequency, kept inside the plot. @param {number} rad_s
   *  @param {number} [edge] */
  onCurve(rad_s, edge = 8) {
    const { top, bottom } = this.geometry.gain;
    const y = this.gain.px(this.read("magnitude_db", rad_s));
    return Number.isFinite(y) ? Math.max(top + edge, Math.min(bottom - edge, y)) : bottom - edge;
  }

  /** @param {number} rad_s */
  inSight(rad_s) {
    const x = this.x.px(rad_s);
    return x >= this.x.start - 0.5 && x <= this.x.end + 0.5;
  }

  /** @param {number} stage */
  nameOf(stage) {
    return stageName(this.design.compensator.stages[stage]);
  }
}
