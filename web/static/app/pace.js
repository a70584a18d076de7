/**
 * The page measures itself: from each pointer event that moved something to the painted frame that shows it.
 * Read-out: `document.documentElement.dataset.pace`, JSON, renewed while a hand moves and after it rests.
 *
 * A move whose own frame never came, because a newer one overtook it, is superseded; its time runs until the
 * overtaking frame is painted, and it counts as missed when that took more than 33 ms, as any other move does.
 */

const MISSED_AFTER_MS = 33;
const REST_MS = 400;

/** @typedef {{time: number, seq: number}} Move */

/** @param {HTMLElement} root @param {import("./store.js").Store} store */
export function measurePace(root, store) {
  let waiting = /** @type {Move[]} */ ([]);
  let latencies = /** @type {number[]} */ ([]);
  let paints = /** @type {number[]} */ ([]);
  let superseded = 0;
  let last = 0;

  function moved(/** @type {number} */ time, /** @type {number} */ seq) {
    if (time - last > 1000) restart();
    last = time;
    waiting.push({ time, seq });
  }

  function restart() {
    waiting = [];
    latencies = [];
    paints = [];
    superseded = 0;
  }

  function painted(/** @type {number} */ seq) {
    const now = performance.now();
    const shown = waiting.filter((move) => move.seq <= seq);
    if (shown.length === 0) return;
    waiting = waiting.filter((move) => move.seq > seq);
    for (const move of shown) latencies.push(now - move.time);
    superseded += shown.filter((move) => move.seq < seq).length;
    paints.push(now);
    writeSoon();
  }

  let timer = 0;
  function writeSoon() {
    if (!timer) timer = window.setTimeout(() => { timer = 0; write(); }, REST_MS);
  }

  function write() {
    const sorted = [...latencies].sort((a, b) => a - b);
    const span = paints.length > 1 ? (paints[paints.length - 1] - paints[0]) / 1000 : 0;
    root.dataset.pace = JSON.stringify({
      moves: latencies.length + waiting.length,
      unpainted: waiting.length,
      superseded,
      missed: latencies.filter((latency) => latency > MISSED_AFTER_MS).length,
      paints: paints.length,
      paints_per_s: span ? Number(((paints.length - 1) / span).toFixed(1)) : 0,
      p50_ms: rank(sorted, 0.5),
      p95_ms: rank(sorted, 0.95),
      worst_ms: rank(sorted, 1),
    });
  }

  // Asked for after the charts asked for theirs, so this runs after they have drawn; the message comes after
  // the browser has painted.
  store.addEventListener("frame", () => {
    if (waiting.length === 0) return;
    const seq = store.frame?.seq ?? 0;
    requestAnimationFrame(() => {
      const { port1, port2 } = new MessageChannel();
      port1.onmessage = () => painted(seq);
      port2.postMessage(null);
    });
  });

  return { moved };
}

function rank(/** @type {number[]} */ sorted, /** @type {number} */ part) {
  if (sorted.length === 0) return null;
  return Number(sorted[Math.min(sorted.length - 1, Math.ceil(part * sorted.length) - 1)].toFixed(1));
}
