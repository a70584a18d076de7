/** The settled picture, drawn by Plotly with everything of its own look and behaviour switched off. */

import { looks } from "./look.js";
import { tokens } from "./theme.js";

/** @typedef {import("./loop_picture.js").Picture} Picture */
/** @typedef {import("./loop_picture.js").Curve} Curve */

/** @param {HTMLElement} node */
export function settledFigure(node) {
  const Plotly = /** @type {any} */ (window).Plotly;
  return {
    /** @param {Picture} picture @returns {Promise<void>} */
    draw: (picture) => Plotly.react(node, traces(picture), layout(picture), { staticPlot: true, displayModeBar: false, responsive: false }),
  };
}

function traces(/** @type {Picture} */ picture) {
  const look = looks();
  return picture.plots.flatMap((plot, index) => plot.curves.map((curve, order) => ({
    type: "scatter", mode: "lines", hoverinfo: "skip", showlegend: false,
    uid: `${curve.kind}-${index}-${order}`,
    xaxis: axisName("x", index), yaxis: axisName("y", index),
    ...(curve.kind === "band" ? bandShape(curve, look.band.color) : { x: curve.xs, y: curve.ys, line: plotlyLine(look[curve.kind]) }),
  })));
}

/** A closed outline: up along the high side, back along the low one. */
function bandShape(/** @type {Curve} */ { xs, low, high }, /** @type {string} */ fillcolor) {
  const x = [];
  const y = [];
  const count = xs.length;
  for (let at = 0; at < count; at += 1) if (high && high[at] === high[at]) { x.push(xs[at]); y.push(high[at]); }
  for (let at = count - 1; at >= 0; at -= 1) if (low && low[at] === low[at]) { x.push(xs[at]); y.push(low[at]); }
  return { x, y, fill: "toself", fillcolor, line: { width: 0 } };
}

function layout(/** @type {Picture} */ picture) {
  const { soft, hairline, "zero-line": zeroLine, font } = tokens("soft", "hairline", "zero-line", "font");
  const { width, height, left, right, plots } = picture;
  const axes = /** @type {Record<string, any>} */ ({});
  const shapes = [];
  for (const [index, plot] of plots.entries()) {
    const base = { showline: false, zeroline: false, gridcolor: hairline, gridwidth: 1, ticks: "", fixedrange: true, automargin: false };
    axes[axisKey("xaxis", index)] = {
      ...base, type: picture.logarithmic ? "log" : "linear", range: plot.x, anchor: axisName("y", index), domain: [0, 1],
      tickmode: "array", tickvals: plot.xTicks.map((tick) => tick.at), ticktext: plot.xTicks.map((tick) => tick.text),
      showticklabels: plot.xTicks.some((tick) => tick.text), tickangle: 0,
    };
    axes[axisKey("yaxis", index)] = {
      ...base, type: "linear", range: plot.y, anchor: axisName("x", index), domain: [1 - plot.bottom / height, 1 - plot.top / height],
      tickmode: "array", tickvals: plot.yTicks.map((tick) => tick.at), ticktext: plot.yTicks.map((tick) => tick.text), ticklabelstandoff: 4,
    };
    for (const at of plot.lines) {
      shapes.push({
        type: "line", layer: "below", xref: `${axisName("x", index)} domain`, yref: axisName("y", index), x0: 0, x1: 1, y0: at, y1: at,
        line: { color: zeroLine, width: 1.4 },
      });
    }
  }
  return {
    width, height, margin: { l: left, r: width - right, t: 0, b: 0, pad: 0 }, paper_bgcolor: "transparent", plot_bgcolor: "transparent",
    font: { family: font, size: 11, color: soft }, shapes, ...axes,
  };
}

function plotlyLine(/** @type {import("./look.js").Look} */ { color, width, dash }) {
  return { color, width, simplify: false, dash: dash.length ? dash.map((length) => `${length}px`).join(",") : "solid" };
}

function axisName(/** @type {string} */ letter, /** @type {number} */ index) {
  return index === 0 ? letter : `${letter}${index + 1}`;
}

function axisKey(/** @type {string} */ word, /** @type {number} */ index) {
  return index === 0 ? word : `${word}${index + 1}`;
}
