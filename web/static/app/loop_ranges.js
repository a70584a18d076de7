/** The ranges of the loop chart's axes: fitted when a design opens, steady while it is worked on, frozen while held. */

import { cornersOf } from "./corners.js";
import { fittedFrequencies, fittedGain, fittedPhase, steady, View } from "./view.js";

export class LoopRanges {
  view = new View();
  /** @type {[number, number] | null} */ #gain = null;
  /** @type {[number, number] | null} */ #phase = null;
  #drawn = "";

  /** @param {import("./store.js").Store} store */
  constructor(store) {
    this.store = store;
  }

  /** Another design was opened: nothing of the old view fits it. */
  startAnew() {
    this.view.forget();
    this.view.fitted = null;
    this.#gain = null;
    this.#phase = null;
  }

  /** Renew what may be renewed. @param {boolean} frozen */
  follow(frozen) {
    if (frozen && this.view.range && this.#gain) return;
    const { design, lastGood } = this.store;
    const { assessment, arrays } = /** @type {any} */ (lastGood);
    if (!this.view.fitted || this.#cornerOutOfSight(design)) {
      this.view.fitted = fittedFrequencies(design, assessment, arrays.omega_rad_s.data);
    }
    const x = /** @type {[number, number]} */ (this.view.range);
    const sameX = this.#drawn === x.join();
    this.#drawn = x.join();
    const last = assessment.cases[0].readings.last_crossover_rad_s?.value ?? assessment.cases[0].gain_crossovers.at(-1)?.rad_s;
    this.#gain = steady(sameX ? this.#gain : null, fittedGain(arrays, x));
    this.#phase = steady(sameX ? this.#phase : null, fittedPhase(arrays, x, last));
  }

  now() {
    return /** @type {{x: [number, number], gain: [number, number], phase: [number, number]}} */ (
      { x: this.view.range, gain: this.#gain, phase: this.#phase });
  }

  /** The farthest a zoom may go: what the server sampled. @returns {[number, number]} log10 of rad/s */
  limits() {
    const omega = /** @type {any} */ (this.store.lastGood).arrays.omega_rad_s.data;
    return [Math.log10(omega[0]), Math.log10(omega[omega.length - 1])];
  }

  #cornerOutOfSight(/** @type {any} */ design) {
    const [from, to] = /** @type {[number, number]} */ (this.view.fitted);
    return cornersOf(design).some(({ rad_s }) => Math.log10(rad_s) < from || Math.log10(rad_s) > to);
  }
}
