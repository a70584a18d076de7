/**
 * The moving curves: a canvas over the plot areas, drawn with the same arithmetic as the axes. Plotly needs
 * some 60 ms for a redraw; this takes two or three, so it can follow a hand.
 */

import { looks } from "./look.js";
import { linearScale } from "./scales.js";

/** @typedef {import("./loop_picture.js").Picture} Picture */
/** @typedef {import("./loop_picture.js").Plot} Plot */
/** @typedef {import("./loop_picture.js").Curve} Curve */

/** @param {HTMLCanvasElement} canvas */
export function liveLayer(canvas) {
  const pen = /** @type {CanvasRenderingContext2D} */ (canvas.getContext("2d"));
  let look = /** @type {Record<string, import("./look.js").Look> | null} */ (null);
  return {
    /** Colours may have changed. */
    forgetLook() { look = null; },
    clear() { canvas.hidden = true; },
    /** @param {Picture} picture */
    draw(picture) {
      look ??= looks();
      canvas.hidden = false;
      fitCanvas(canvas, pen, picture.width, picture.height);
      for (const plot of picture.plots) drawPlot(pen, picture, plot, look);
    },
  };
}

function fitCanvas(/** @type {HTMLCanvasElement} */ canvas, /** @type {CanvasRenderingContext2D} */ pen,
  /** @type {number} */ width, /** @type {number} */ height) {
  const dense = window.devicePixelRatio || 1;
  const [wide, high] = [Math.round(width * dense), Math.round(height * dense)];
  if (canvas.width !== wide || canvas.height !== high) {
    canvas.width = wide;
    canvas.height = high;
    canvas.style.width = `${width}px`;
    canvas.style.height = `${height}px`;
  }
  pen.setTransform(dense, 0, 0, dense, 0, 0);
  pen.clearRect(0, 0, width, height);
}

function drawPlot(/** @type {CanvasRenderingContext2D} */ pen, /** @type {Picture} */ { left, right, logarithmic },
  /** @type {Plot} */ plot, /** @type {Record<string, import("./look.js").Look>} */ look) {
  const y = linearScale(plot.y, plot.bottom, plot.top);
  pen.save();
  pen.beginPath();
  pen.rect(left, plot.top, right - left, plot.bottom - plot.top);
  pen.clip();
  pen.lineJoin = "round";
  for (const curve of plot.curves) {
    const { color, width, dash } = look[curve.kind];
    const across = pixels(curve.xs, plot.x, left, right, logarithmic);
    pen.beginPath();
    if (curve.low && curve.high) {
      // Up along the high side, back along the low one.
      follow(pen, across, curve.high, y, 1);
      follow(pen, across, curve.low, y, -1);
      pen.closePath();
      pen.fillStyle = color;
      pen.fill();
    } else {
      follow(pen, across, /** @type {ArrayLike<number>} */ (curve.ys), y, 1);
      pen.strokeStyle = color;
      pen.lineWidth = width;
      pen.setLineDash(dash);
      pen.stroke();
    }
  }
  pen.restore();
}

// Values far outside would make the rasteriser work for nothing, and infinities break a path.
const FAR_PX = 4000;
// Samples crowd where modes are sharp and at the start of a response; a step smaller than this is not seen.
const NEAR_PX = 0.7;

/** @typedef {{px: Float64Array, first: number, last: number}} Across  `first` to `last` cover what is in sight */

/** Forwards as a new path, backwards as the rest of one. */
function follow(/** @type {CanvasRenderingContext2D} */ pen, /** @type {Across} */ { px, first, last }, /** @type {ArrayLike<number>} */ ys,
  /** @type {import("./scales.js").Scale} */ y, /** @type {1 | -1} */ way) {
  let down = way === -1;
  let [lastX, lastY] = [NaN, NaN];
  for (let at = way === 1 ? first : last; at >= first && at <= last; at += way) {
    const value = ys[at];
    if (value !== value) {
      down = way === -1;
      continue;
    }
    const py = Math.max(-FAR_PX, Math.min(FAR_PX, y.start + (value - y.from) * y.perUnit));
    if (down && Math.abs(px[at] - lastX) < NEAR_PX && Math.abs(py - lastY) < NEAR_PX) continue;
    if (down) pen.lineTo(px[at], py);
    else pen.moveTo(px[at], py);
    [lastX, lastY] = [px[at], py];
    down = true;
  }
}

let known = /** @type {{xs: ArrayLike<number> | null, key: string, across: Across}} */ ({ xs: null, key: "", across: { px: new Float64Array(0), first: 0, last: -1 } });

// All curves of a plot, and both loop plots, share one array of frequencies: convert it once.
function pixels(/** @type {ArrayLike<number>} */ xs, /** @type {[number, number]} */ range, /** @type {number} */ left,
  /** @type {number} */ right, /** @type {boolean} */ logarithmic) {
  const key = `${range[0]}|${range[1]}|${left}|${right}|${logarithmic}`;
  if (known.xs === xs && known.key === key) return known.across;
  const px = new Float64Array(xs.length);
  const perUnit = (right - left) / (range[1] - range[0]);
  let [first, last] = [0, px.length - 1];
  for (let at = 0; at < px.length; at += 1) {
    px[at] = left + ((logarithmic ? Math.log10(xs[at]) : xs[at]) - range[0]) * perUnit;
    if (px[at] < left) first = at;
    if (px[at] > right && at < last) last = at;
  }
  known = { xs, key, across: { px, first, last } };
  return known.across;
}
