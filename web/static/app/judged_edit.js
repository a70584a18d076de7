import { faultsOf } from "./request.js";

/** Edits that wait for the server's judgement go one after the other, so that each is judged on top of the last. */
let last = Promise.resolve();

/**
 * Change the design if the server can use the result.
 *
 * @param {import("./store.js").Store} store
 * @param {string} label of the step in the history
 * @param {(design: object) => object} change
 * @returns {Promise<import("./request.js").Fault[]>} what is wrong with the result; empty when it was taken over
 */
export function judgedEdit(store, label, change) {
  const mine = last.then(() => judgeAndEdit(store, label, change));
  last = mine.then(() => {});
  return mine;
}

async function judgeAndEdit(store, label, change) {
  for (;;) {
    const judged = store.design;
    const faults = await faultsOf(change(judged));
    if (faults.length > 0) return faults;
    // An undo or a drag may have come in between: then the result is another one.
    if (store.design !== judged) continue;
    store.edit(label, change);
    return [];
  }
}
