/**
 * The live path: one WebSocket, never more than one request on the way and one waiting (the newest).
 * A lost connection is said, the newest request is kept, and it is sent again once the server is back.
 */

import { decodeFrame } from "./frame.js";

const FIRST_PAUSE_MS = 250;
const LONGEST_PAUSE_MS = 5000;
const NO_ANSWER_MS = 10000;

/** @typedef {{seq: number, design: any, aim?: {crossover_rad_s: number}}} Request */

/** @param {import("./store.js").Store} store */
export function startLive(store) {
  const live = new Live(store);
  store.sendWith((request) => live.send(request));
  live.open();
  return live;
}

class Live {
  /** @type {WebSocket | null} */ #socket = null;
  /** @type {Request | null} */ #onTheWay = null;
  /** @type {Request | null} */ #waiting = null;
  #pause = FIRST_PAUSE_MS;
  #watch = 0;

  /** @param {import("./store.js").Store} store */
  constructor(store) {
    this.store = store;
    // A machine that wakes up or a network that returns should not wait for the pause to pass.
    addEventListener("online", () => this.#reopenNow());
  }

  /** @param {Request} request */
  send(request) {
    this.#waiting = request;
    this.#next();
  }

  open() {
    const socket = new WebSocket(liveAddress());
    socket.binaryType = "arraybuffer";
    socket.onopen = () => {
      this.#pause = FIRST_PAUSE_MS;
      this.store.setConnection("open");
      this.#next();
    };
    socket.onmessage = (event) => this.#take(event.data);
    socket.onclose = () => this.#lost(socket);
    this.#socket = socket;
  }

  #next() {
    if (this.#onTheWay || !this.#waiting || this.#socket?.readyState !== WebSocket.OPEN) return;
    this.#onTheWay = this.#waiting;
    this.#waiting = null;
    this.#socket.send(JSON.stringify(this.#onTheWay));
    this.#watch = window.setTimeout(() => this.#socket?.close(), NO_ANSWER_MS);
  }

  #take(/** @type {ArrayBuffer} */ data) {
    clearTimeout(this.#watch);
    this.#onTheWay = null;
    this.#next(); // before decoding: the server works on the next step while this one is drawn
    this.store.receive(decodeFrame(data));
  }

  #lost(/** @type {WebSocket} */ socket) {
    if (socket !== this.#socket) return;
    clearTimeout(this.#watch);
    this.#waiting ??= this.#onTheWay;
    this.#onTheWay = null;
    this.#socket = null;
    this.store.setConnection("lost");
    window.setTimeout(() => this.#reopenNow(), this.#pause);
    this.#pause = Math.min(this.#pause * 2, LONGEST_PAUSE_MS);
  }

  #reopenNow() {
    if (!this.#socket) this.open();
  }
}

/** One frame for one design, beside the live stream: for the pinned reference. @param {any} design
 *  @returns {Promise<import("./store.js").Frame>} */
export function frameOnce(design) {
  return new Promise((resolve, reject) => {
    const socket = new WebSocket(liveAddress());
    socket.binaryType = "arraybuffer";
    socket.onopen = () => socket.send(JSON.stringify({ seq: 1, design }));
    socket.onmessage = (event) => {
      resolve(decodeFrame(event.data));
      socket.close();
    };
    socket.onerror = () => reject(new Error("the server does not answer"));
  });
}

function liveAddress() {
  return `${location.protocol === "https:" ? "wss" : "ws"}://${location.host}/live`;
}
