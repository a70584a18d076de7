/** The marks of the trade: o for a zero, x for a pole, a conjugate pair as two, a chevron for a notch. */

import { svg } from "./svg.js";

/** @param {string} kind @returns {SVGElement} */
export function glyph(kind) {
  switch (kind) {
    case "o": return svg("g", { class: "glyph" }, disc(10), ring(0, 6));
    case "x": return svg("g", { class: "glyph" }, disc(10), cross(0, 5));
    case "oo": return svg("g", { class: "glyph" }, capsule(), ring(-5, 3.6), ring(5, 3.6));
    case "xx": return svg("g", { class: "glyph" }, capsule(), cross(-5, 3.2), cross(5, 3.2));
    default: return svg("g", { class: "glyph" }, disc(10), svg("path", { class: "stroke", d: "M-6 -5L0 5L6 -5" }));
  }
}

// A disc in the colour of the ground: the curve must not run through the mark.
function disc(/** @type {number} */ r) {
  return svg("circle", { class: "glyph-ground", r });
}

function capsule() {
  return svg("rect", { class: "glyph-ground", x: -8, y: -12, width: 16, height: 24, rx: 8 });
}

function ring(/** @type {number} */ cy, /** @type {number} */ r) {
  return svg("circle", { class: "stroke", cy, r });
}

function cross(/** @type {number} */ cy, /** @type {number} */ a) {
  return svg("path", { class: "stroke", d: `M${-a} ${cy - a}L${a} ${cy + a}M${-a} ${cy + a}L${a} ${cy - a}` });
}
