/**
 * A picture on the page: Plotly's settled drawing with the live canvas over it. While something is held the
 * settled drawing stays as the ghost and the canvas moves; afterwards Plotly draws once and the canvas goes.
 */

import { el } from "./element.js";
import { liveLayer } from "./live_layer.js";
import { settledFigure } from "./settled.js";
import { set, svg } from "./svg.js";

/** @typedef {import("./loop_picture.js").Picture} Picture */

/** @param {HTMLElement} root @param {import("./store.js").Store} store @param {string} label for screen readers
 *  @param {() => void} resized */
export function pictureStage(root, store, label, resized) {
  const figure = el("div", { class: "figure", role: "img", "aria-label": label });
  const canvas = /** @type {HTMLCanvasElement} */ (el("canvas", { class: "live-curves", hidden: true, "aria-hidden": "true" }));
  const overlay = svg("svg", { class: "overlay" });
  const node = el("div", { class: "stage" }, figure, canvas, overlay);
  root.append(node);
  const settled = settledFigure(figure);
  const live = liveLayer(canvas);
  let drawnKey = "";
  let moving = false;
  let tall = 0;
  const size = { width: 0, height: 0 };
  // Asking an element for its size in mid-drawing makes the browser lay the page out there and then.
  new ResizeObserver(() => {
    size.width = root.clientWidth;
    size.height = root.clientHeight;
    resized();
  }).observe(root);
  store.addEventListener("theme", () => {
    live.forgetLook();
    drawnKey = "";
  });

  return {
    node, overlay, size,
    /** Its height, and words for what it shows; these wait until the hand rests. @param {number} width
     *  @param {number} height @param {() => string} words */
    dress(width, height, words) {
      set(overlay, { width, height });
      if (tall !== height) node.style.height = `${height}px`;
      tall = height;
      node.classList.toggle("is-stale", store.frame?.ok === false);
      if (!this.frozen) set(figure, { "aria-label": words() });
    },
    /** True while axes must stand still: something is held, or its last frame is still on the way. */
    get frozen() {
      return Boolean(store.holding) || (moving && store.waiting && store.connection === "open");
    },
    /** @param {Picture} picture @param {string} key what it is made from: the same key needs no new drawing */
    draw(picture, key) {
      const live_ = this.frozen;
      if (live_ && drawnKey) {
        live.draw(picture);
      } else if (key !== drawnKey) {
        settled.draw(picture);
        drawnKey = key;
      }
      if (!live_) live.clear();
      moving = live_;
      node.classList.toggle("is-held", live_);
    },
  };
}

/** A key that changes whenever the curves, their axes or their ground do. @param {import("./store.js").Store} store
 *  @param {Picture} picture @param {number | undefined} markedCase */
export function pictureKey(store, picture, markedCase) {
  const axes = picture.plots.map((plot) => [plot.x, plot.y, plot.top, plot.bottom].join());
  return [store.lastGood?.seq, store.pinned?.frame?.seq, Boolean(store.pinned), markedCase, store.ui.unit, picture.width, ...axes,
    store.design?.actuator?.low, store.design?.actuator?.high].join("|");
}
