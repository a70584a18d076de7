/** "fit" and "back": what the wheel and the box did is undone in words, not with a tool bar. */

import { el, textButton } from "./element.js";

/** @param {import("./view.js").View} view @param {() => void} changed @param {string} what */
export function zoomWords(view, changed, what) {
  const act = (/** @type {() => void} */ change) => () => {
    change();
    changed();
  };
  const fit = textButton("fit", act(() => view.fit()), { "aria-label": `fit: show all ${what} again`, class: "zoom-word" });
  const back = textButton("back", act(() => view.back()), { "aria-label": `back to the ${what} shown before`, class: "zoom-word" });
  const node = el("div", { class: "zoom-words" }, fit, back);
  return {
    node,
    place(/** @type {number} */ left, /** @type {number} */ top) {
      node.style.transform = `translate(${left}px, ${top}px)`;
      fit.hidden = !view.chosen;
      back.hidden = !view.canGoBack;
    },
  };
}
