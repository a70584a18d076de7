/**
 * One thing to take hold of: an SVG group that is a slider. Pointer, pen, touch and keys all end in the same
 * three verbs of the store: hold, move, release (or put back).
 *
 * @typedef {object} Grasp            what a handle does, in its own natural value
 * @property {() => string} name      "lead zero"
 * @property {() => number} value
 * @property {() => string} text      the value in words: "9.50 rad/s"
 * @property {() => [number, number]} ends   what Home and End set
 * @property {(start: number, dx: number, dy: number) => number} dragged   after a move in px, fine moves scaled
 * @property {(value: number, steps: number) => number} stepped   a coarse key step is 10, a fine one 1
 * @property {(design: any, value: number) => any} set
 * @property {(value: number) => import("./store.js").Aim} [aim]  where the server is to choose the gain
 * @property {(value: number) => string} [typed]  as it stands in the field when typed
 * @property {(shown: number) => number} [read]   back from the field
 * @property {(design: any, shown: number) => any} [keep]  what a typed number does, where that is more than `set`
 * @property {(shown: number) => string | null} [refuse]  what is wrong with a typed number
 * @property {() => {x: number, y: number}} at    where the flag belongs, px of the stage
 * @property {number | "gain" | null} stage
 *
 * @typedef {{store: import("./store.js").Store, pace: any, type: (grasp: Grasp) => void,
 *            light: (grasp: Grasp | null, how: "held" | "near" | "none") => void}} Hand
 */

import { rounded } from "./corners.js";
import { set, svg } from "./svg.js";

const FINE = 0.1;
/** Key presses closer than this are one step of the history. */
const REST_MS = 700;
const REACH = 14;

/** @param {Hand} hand @param {Grasp} grasp @param {{class?: string, reach?: number | null, orientation?: string, where?: string}} [look]
 *  `reach`: radius of the target, null where the drawing is the target; `where` tells twins apart for a screen reader
 *  @param {...Node} drawing what is seen @returns {{node: SVGElement, grasp: Grasp, speak: () => void}} */
export function handle(hand, grasp, look = {}, ...drawing) {
  const target = look.reach === null ? [] : [svg("circle", { class: "reach", r: look.reach ?? REACH })];
  const node = svg("g", {
    class: `handle ${look.class ?? ""}`, role: "slider", tabindex: 0, "aria-orientation": look.orientation ?? "horizontal",
  }, ...target, ...drawing);
  const speak = () => {
    const [least, most] = grasp.ends();
    set(node, {
      "aria-label": look.where ? `${grasp.name()}, ${look.where}` : grasp.name(), "aria-valuemin": rounded(least), "aria-valuemax": rounded(most),
      "aria-valuenow": rounded(grasp.value()), "aria-valuetext": grasp.text(),
    });
  };
  followPointer(node, hand, grasp);
  followKeys(node, hand, grasp);
  node.addEventListener("pointerenter", () => hand.light(grasp, "near"));
  node.addEventListener("pointerleave", () => hand.light(grasp, "none"));
  node.addEventListener("focus", () => node.matches(":focus-visible") && hand.light(grasp, "near"));
  node.addEventListener("blur", () => hand.light(grasp, "none"));
  node.addEventListener("dblclick", () => hand.type(grasp));
  return { node, grasp, speak };
}

function followPointer(/** @type {SVGElement} */ node, /** @type {Hand} */ hand, /** @type {Grasp} */ grasp) {
  const { store, pace } = hand;
  let pull = /** @type {{id: number, x: number, y: number, start: number, dx: number, dy: number} | null} */ (null);

  node.addEventListener("pointerdown", (event) => {
    if (event.button !== 0 || pull) return;
    node.setPointerCapture(event.pointerId);
    pull = { id: event.pointerId, x: event.clientX, y: event.clientY, start: grasp.value(), dx: 0, dy: 0 };
    store.hold(`move ${grasp.name()}`);
    hand.light(grasp, "held");
  });
  const follow = (/** @type {PointerEvent} */ event) => {
    if (event.pointerId !== pull?.id || !store.holding) return;
    if (event.clientX === pull.x && event.clientY === pull.y) return;
    const part = event.shiftKey ? FINE : 1;
    pull.dx += (event.clientX - pull.x) * part;
    pull.dy += (event.clientY - pull.y) * part;
    pull.x = event.clientX;
    pull.y = event.clientY;
    const value = rounded(grasp.dragged(pull.start, pull.dx, pull.dy));
    if (moveTo(store, grasp, value)) pace.moved(event.timeStamp, store.seq);
  };
  // pointermove waits for the next animation frame; the raw update, where there is one, reaches the server sooner,
  // so that its answer can still be painted in that frame. The pointermove that follows it then changes nothing.
  node.addEventListener("pointerrawupdate", /** @type {any} */ (follow));
  node.addEventListener("pointermove", follow);
  const end = (/** @type {PointerEvent} */ event) => {
    if (event.pointerId !== pull?.id) return;
    pull = null;
    store.release();
    hand.light(grasp, node.matches(":hover") ? "near" : "none");
  };
  for (const type of ["pointerup", "pointercancel", "lostpointercapture"]) {
    node.addEventListener(type, /** @type {any} */ (end));
  }
}

function followKeys(/** @type {SVGElement} */ node, /** @type {Hand} */ hand, /** @type {Grasp} */ grasp) {
  const { store, pace } = hand;
  let timer = 0;
  const rest = () => {
    if (!timer) return;
    clearTimeout(timer);
    timer = 0;
    store.release();
    hand.light(grasp, "near");
  };
  node.addEventListener("keydown", (event) => {
    if (event.key === "Escape" && store.holding) {
      clearTimeout(timer);
      timer = 0;
      store.putBack();
      hand.light(grasp, "near");
      return event.preventDefault();
    }
    if (event.key === "Enter") {
      rest();
      hand.type(grasp);
      return event.preventDefault();
    }
    const value = keyed(event, grasp);
    if (value === null) return undefined;
    event.preventDefault();
    if (!store.holding) store.hold(`move ${grasp.name()}`);
    clearTimeout(timer);
    timer = window.setTimeout(rest, REST_MS);
    hand.light(grasp, "held");
    if (moveTo(store, grasp, rounded(value))) pace.moved(event.timeStamp, store.seq);
    return undefined;
  });
  node.addEventListener("blur", rest);
}

function moveTo(/** @type {import("./store.js").Store} */ store, /** @type {Grasp} */ grasp, /** @type {number} */ value) {
  const [least, most] = limits(grasp);
  const within = Math.min(most, Math.max(least, value));
  if (within === grasp.value() && !grasp.aim) return false;
  store.move((design) => grasp.set(design, within), grasp.aim ? { aim: grasp.aim(within) } : {});
  return true;
}

// The hand stays inside what is shown; a value that already lies outside may stay there.
function limits(/** @type {Grasp} */ grasp) {
  const [least, most] = grasp.ends();
  return [Math.min(least, grasp.value()), Math.max(most, grasp.value())];
}

/** @returns {number | null} */
function keyed(/** @type {KeyboardEvent} */ event, /** @type {Grasp} */ grasp) {
  const size = event.shiftKey ? 1 : 10;
  switch (event.key) {
    case "ArrowRight": case "ArrowUp": return grasp.stepped(grasp.value(), size);
    case "ArrowLeft": case "ArrowDown": return grasp.stepped(grasp.value(), -size);
    case "PageUp": return grasp.stepped(grasp.value(), 100);
    case "PageDown": return grasp.stepped(grasp.value(), -100);
    case "Home": return grasp.ends()[0];
    case "End": return grasp.ends()[1];
    default: return null;
  }
}

/** Value on a logarithmic axis: a full drag step is a px, a key step a 400th of a decade. */
export const logarithmic = {
  /** @param {() => number} pxPerDecade */
  dragged: (pxPerDecade) => (/** @type {number} */ start, /** @type {number} */ dx) => start * 10 ** (dx / pxPerDecade()),
  stepped: (/** @type {number} */ value, /** @type {number} */ steps) => value * 10 ** (steps / 400),
};
