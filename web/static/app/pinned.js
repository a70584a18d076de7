/** After a reload the pinned design has no curves yet: fetch them once the server answers. */

import { frameOnce } from "./live.js";

/** @param {import("./store.js").Store} store */
export function keepPinnedDrawn(store) {
  let asked = null;
  const complete = () => {
    const { pinned } = store;
    if (!pinned || pinned.frame || store.connection !== "open" || asked === pinned.design) return;
    asked = pinned.design;
    frameOnce(pinned.design).then((frame) => {
      if (frame.ok && store.pinned?.design === pinned.design) store.completePin(frame);
    }).catch(() => {
      asked = null;
    });
  };
  store.addEventListener("pinned", complete);
  store.addEventListener("connection", complete);
}
