/**
 * Keeps the work in progress in this browser. Each tab writes its own copy, so two tabs never overwrite each
 * other; work of a tab that was closed is taken over, as a copy, by the next tab that opens without any.
 */

const PREFIX = "loopwright.work.";
const SCREEN = "loopwright.screen";
const TAB = "loopwright.tab";
const SAVE_AFTER_MS = 250;
const KEPT_WORKS = 8;
const ANSWER_WITHIN_MS = 120;

let tab = "";
/** The copy this tab wrote before its reload: removed once a newer one is safe. */
let replaced = "";
const channel = "BroadcastChannel" in window ? new BroadcastChannel("loopwright.tabs") : null;

/** @param {import("./store.js").Store} store */
export function keepWork(store) {
  let timer = 0;
  const save = () => {
    clearTimeout(timer);
    if (store.design) write(store);
  };
  const soon = () => {
    clearTimeout(timer);
    timer = window.setTimeout(save, SAVE_AFTER_MS);
  };
  for (const type of ["design", "history", "pinned", "holding"]) store.addEventListener(type, soon);
  store.addEventListener("ui", () => put(SCREEN, JSON.stringify({ unit: store.ui.unit, theme: store.ui.theme })));
  addEventListener("pagehide", save);
  document.addEventListener("visibilitychange", () => document.visibilityState === "hidden" && save());
  channel?.addEventListener("message", (event) => {
    if (event.data.ask) channel.postMessage({ alive: tab, to: event.data.ask });
  });
}

/** The settings of the screen as they were. @returns {Record<string, any>} */
export function keptScreen() {
  return read(SCREEN) ?? {};
}

/** This tab's own work, if it was here before (a reload). @returns {any | null} */
export function ownWork() {
  const before = sessionStorage.getItem(TAB);
  tab = newId();
  sessionStorage.setItem(TAB, tab);
  if (!before) return null;
  // A duplicated tab starts with its original's id: then both go on, each with a copy.
  livingTabs().then((living) => {
    if (!living.has(before)) replaced = before;
  });
  return read(PREFIX + before);
}

/** The newest work whose tab is gone. @returns {Promise<any | null>} */
export async function orphanedWork() {
  const works = savedWorks();
  if (works.length === 0) return null;
  const living = await livingTabs();
  return works.find((work) => !living.has(work.tab)) ?? null;
}

function write(/** @type {import("./store.js").Store} */ store) {
  for (const steps of [50, 10, 0]) {
    const text = JSON.stringify({ tab, saved_at: Date.now(), ...store.snapshot(steps) });
    if (!put(PREFIX + tab, text)) continue;
    if (replaced) localStorage.removeItem(PREFIX + replaced);
    replaced = "";
    break;
  }
  for (const work of savedWorks().slice(KEPT_WORKS)) localStorage.removeItem(PREFIX + work.tab);
}

/** All works, newest first. @returns {any[]} */
function savedWorks() {
  const keys = Object.keys(localStorage).filter((key) => key.startsWith(PREFIX));
  return keys.map(read).filter((work) => work?.design).sort((a, b) => b.saved_at - a.saved_at);
}

/** Tabs that are open now, this one left out. @returns {Promise<Set<string>>} */
function livingTabs() {
  return new Promise((resolve) => {
    const living = /** @type {Set<string>} */ (new Set());
    if (!channel) return resolve(living);
    const listen = (/** @type {MessageEvent} */ event) => event.data.to === tab && living.add(event.data.alive);
    channel.addEventListener("message", listen);
    channel.postMessage({ ask: tab });
    window.setTimeout(() => {
      channel.removeEventListener("message", listen);
      resolve(living);
    }, ANSWER_WITHIN_MS);
  });
}

/** @returns {boolean} false when the browser has no room */
function put(/** @type {string} */ key, /** @type {string} */ text) {
  try {
    localStorage.setItem(key, text);
    return true;
  } catch {
    return false;
  }
}

function read(/** @type {string} */ key) {
  try {
    return JSON.parse(localStorage.getItem(key) ?? "null");
  } catch {
    return null;
  }
}

function newId() {
  return [...crypto.getRandomValues(new Uint8Array(8))].map((byte) => byte.toString(16).padStart(2, "0")).join("");
}
