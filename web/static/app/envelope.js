/** What a frame's curves come to on the charts: the nominal, the band of all cases, one case alone. */

/** @typedef {{low: Float32Array, high: Float32Array}} Band */
/** @typedef {import("./store.js").FrameArray} FrameArray */

/** One case's curve. @param {FrameArray} array (cases, points) @param {number} index @returns {Float32Array} */
export function curveOf(array, index) {
  const points = array.shape[1];
  return array.data.subarray(index * points, (index + 1) * points);
}

const bands = /** @type {WeakMap<Float32Array, Map<string, Band>>} */ (new WeakMap());

/** Least and greatest over the cases at each point; NaN where no case has a value. Kept, as one frame is drawn
 *  by several layers. @param {FrameArray} array @param {boolean[]} taken which cases count @returns {Band} */
export function bandOf(array, taken) {
  const key = taken.join();
  const known = bands.get(array.data)?.get(key);
  if (known) return known;
  const band = computeBand(array, taken);
  if (!bands.has(array.data)) bands.set(array.data, new Map());
  bands.get(array.data)?.set(key, band);
  return band;
}

function computeBand(/** @type {FrameArray} */ { shape: [cases, points], data }, /** @type {boolean[]} */ taken) {
  const low = new Float32Array(points).fill(NaN);
  const high = new Float32Array(points).fill(NaN);
  for (let index = 0; index < cases; index += 1) {
    if (!taken[index]) continue;
    const start = index * points;
    for (let at = 0; at < points; at += 1) {
      const value = data[start + at];
      if (!(low[at] <= value)) if (value === value) low[at] = value;
      if (!(high[at] >= value)) if (value === value) high[at] = value;
    }
  }
  return { low, high };
}

/** Value of a curve between its points; NaN outside. @param {Float32Array} xs increasing @param {Float32Array} ys
 *  @param {number} x @param {boolean} [logarithmic] x is a frequency */
export function valueAt(xs, ys, x, logarithmic = false) {
  const last = xs.length - 1;
  if (!(x >= xs[0]) || !(x <= xs[last])) return NaN;
  let low = 0;
  let high = last;
  while (high - low > 1) {
    const middle = (low + high) >> 1;
    if (xs[middle] <= x) low = middle;
    else high = middle;
  }
  const part = logarithmic
    ? Math.log(x / xs[low]) / Math.log(xs[high] / xs[low])
    : (x - xs[low]) / (xs[high] - xs[low]);
  return ys[low] + (ys[high] - ys[low]) * (Number.isFinite(part) ? part : 0);
}

/** Least and greatest value of some curves between two ends of x. @param {Float32Array} xs
 *  @param {Float32Array[]} curves @param {number} from @param {number} to @returns {[number, number]} */
export function extent(xs, curves, from, to) {
  let low = Infinity;
  let high = -Infinity;
  for (let at = 0; at < xs.length; at += 1) {
    if (xs[at] < from || xs[at] > to) continue;
    for (const curve of curves) {
      if (curve[at] < low) low = curve[at];
      if (curve[at] > high) high = curve[at];
    }
  }
  return [low, high];
}
