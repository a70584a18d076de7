/**
 * The one place of state: the design on the screen, the newest frame for it, the pinned reference, the
 * history and the settings of the screen. Modules read from it, change it through its verbs, and listen.
 *
 * @typedef {Record<string, any>} Design    a `loopwright-design/1` document; replaced, never changed in place
 * @typedef {{seq: number, ok: boolean, assessment?: any, arrays?: Record<string, FrameArray>,
 *            gain?: number, design_sha256?: string, errors?: {where: string, what: string}[]}} Frame
 * @typedef {{shape: number[], data: Float32Array}} FrameArray
 * @typedef {{label: string, design: Design}} Step
 * @typedef {{crossover_rad_s: number}} Aim
 * @typedef {{kind: string, name?: string, token?: string, fragment?: string}} Origin
 */

const HISTORY_LIMIT = 200;
/** How long a move waits for its own frame before it is told without it. */
const TOGETHER_MS = 30;

const FIRST_UI = {
  unit: "rad/s",
  theme: "system",
  focusedRow: null, // requirement whose reading the charts mark (index)
  focusedStage: null, // stage that ledger, rail and drawer light up together (index)
};

/** @returns {Store} */
export function createStore() {
  return new Store();
}

export class Store extends EventTarget {
  /** @type {Design | null} */ design = null;
  /** Newest frame, a refusal included (then `ok` is false and `errors` says what). @type {Frame | null} */
  frame = null;
  /** Newest frame with curves: what stays drawn while the design is refused. @type {Frame | null} */
  lastGood = null;
  /** @type {{design: Design, frame: Frame | null} | null} */ pinned = null;
  ui = { ...FIRST_UI };
  /** @type {any[]} */ demos = [];
  /** @type {any[]} */ measures = [];
  /** Where the design came from: a demo, a file, a link. @type {Origin} */
  origin = { kind: "empty" };
  /** What is being held, with the design and the frame as they were when the hand closed. */
  /** @type {{label: string, design: Design, frame: Frame | null} | null} */ holding = null;
  /** @type {"open" | "lost" | "opening"} */ connection = "opening";

  #past = /** @type {Step[]} */ ([]);
  #future = /** @type {Step[]} */ ([]);
  #seq = 0;
  #untold = 0;
  /** The crossover that was asked for, until the server has answered with its gain. @type {Aim | null} */
  aim = null;
  #send = /** @type {(request: {seq: number, design: Design, aim?: Aim}) => void} */ (() => {});

  // ---- changing the design -------------------------------------------------------------------------

  /** One step that can be undone. @param {string} label @param {(design: Design) => Design} change
   *  @param {{aim?: Aim}} [more] */
  edit(label, change, more = {}) {
    if (!this.design) return;
    if (this.holding) this.release();
    const next = change(this.design);
    if (next === this.design && !more.aim) return;
    this.#record(label, this.design);
    this.#show(next, more.aim);
  }

  /** Replace everything: a demo, a file, a link. One step as well. @param {Design} design
   *  @param {{origin?: Origin, label?: string}} [more] */
  load(design, more = {}) {
    if (this.holding) this.putBack();
    if (this.design) this.#record(more.label ?? `open ${design.title || "a design"}`, this.design);
    this.origin = more.origin ?? { kind: "file" };
    this.frame = null;
    this.lastGood = null;
    this.#show(design);
    this.#tell("loaded", this.origin);
  }

  /** A drag begins. Until release or putBack, moves are sent live and are no steps of the history. */
  hold(/** @type {string} */ label) {
    if (!this.design) return;
    if (this.holding) this.release();
    this.holding = { label, design: this.design, frame: this.lastGood };
    this.#tell("holding", { held: true, label });
  }

  /** @param {(design: Design) => Design} change @param {{aim?: Aim}} [more] an aim lets the server choose the gain */
  move(change, more = {}) {
    if (!this.holding || !this.design) return;
    const next = change(this.design);
    if (next === this.design && !more.aim) return;
    this.design = next;
    this.ask(more.aim);
    // Handles and curves are drawn together, in one go: two drawings a move would cost the pace of both.
    this.#untold ||= window.setTimeout(() => this.#tellDesign(), TOGETHER_MS);
  }

  /** The hand opens: what was moved becomes one step. */
  release() {
    const held = this.holding;
    if (!held) return;
    this.holding = null;
    if (this.#untold) this.#tellDesign();
    // A gain that the server still has to choose is part of the step.
    if (held.design !== this.design || this.aim) this.#record(held.label, held.design);
    this.#tell("holding", { held: false, label: held.label });
  }

  /** Escape: everything as it was before the drag. */
  putBack() {
    const held = this.holding;
    if (!held) return;
    this.holding = null;
    if (held.design !== this.design || this.aim) this.#show(held.design);
    this.#tell("holding", { held: false, label: held.label });
  }

  // ---- history -------------------------------------------------------------------------------------

  get canUndo() { return this.#past.length > 0; }
  get canRedo() { return this.#future.length > 0; }
  get undoLabel() { return this.#past.at(-1)?.label ?? ""; }
  get redoLabel() { return this.#future.at(-1)?.label ?? ""; }

  undo() { this.#travel(this.#past, this.#future); }
  redo() { this.#travel(this.#future, this.#past); }

  #travel(/** @type {Step[]} */ from, /** @type {Step[]} */ to) {
    if (this.holding) this.putBack();
    const step = from.pop();
    if (!step || !this.design) return;
    to.push({ label: step.label, design: this.design });
    this.#show(step.design);
    this.#tell("history");
  }

  #record(/** @type {string} */ label, /** @type {Design} */ before) {
    this.#past.push({ label, design: before });
    if (this.#past.length > HISTORY_LIMIT) this.#past.shift();
    this.#future = [];
    this.#tell("history");
  }

  // ---- the reference -------------------------------------------------------------------------------

  /** Keep the present design as the pale reference. */
  pin() {
    if (!this.design) return;
    this.pinned = { design: this.design, frame: this.frame?.ok ? this.frame : null };
    this.#tell("pinned");
  }

  unpin() {
    this.pinned = null;
    this.#tell("pinned");
  }

  /** The pinned design's own frame, once it is known (after a reload). @param {Frame} frame */
  completePin(frame) {
    if (!this.pinned) return;
    this.pinned = { ...this.pinned, frame };
    this.#tell("pinned");
  }

  // ---- screen settings, catalogue, words -----------------------------------------------------------

  setUi(/** @type {Record<string, any>} */ change) {
    const ui = /** @type {any} */ (this.ui);
    if (Object.keys(change).every((key) => ui[key] === change[key])) return;
    this.ui = { ...this.ui, ...change };
    this.#tell("ui", change);
  }

  /** @param {{demos?: any[], measures?: any[]}} catalogue */
  setCatalogue(catalogue) {
    Object.assign(this, catalogue);
    this.#tell("catalogue");
  }

  /** A plain sentence for the status line, announced politely. @param {string} text
   *  @param {"calm" | "trouble"} [tone] */
  say(text, tone = "calm") {
    this.#tell("say", { text, tone });
  }

  // ---- the live path -------------------------------------------------------------------------------

  /** @param {(request: {seq: number, design: Design, aim?: Aim}) => void} send */
  sendWith(send) {
    this.#send = send;
    if (this.design) this.ask();
  }

  /** Ask (again) for the frame of the design as it stands. @param {Aim} [aim] */
  ask(aim) {
    this.#seq += 1;
    this.aim = aim ?? null;
    this.#send({ seq: this.#seq, design: /** @type {Design} */ (this.design), aim });
  }

  /** True while the frame drawn is not yet that of the design. */
  get waiting() { return this.frame?.seq !== this.#seq; }
  get seq() { return this.#seq; }

  /** A decoded frame. Older than what is drawn: dropped, refusals too. @param {Frame} frame */
  receive(frame) {
    if (frame.seq > this.#seq || (this.frame && frame.seq < this.frame.seq)) return;
    this.frame = frame;
    if (frame.ok) this.lastGood = frame;
    if (this.aim && frame.seq === this.#seq) this.#takeGain(frame);
    if (this.#untold) this.#tellDesign();
    this.#tell("frame", frame);
  }

  #takeGain(/** @type {Frame} */ { ok, gain }) {
    const design = /** @type {Design} */ (this.design);
    this.aim = null;
    if (!ok || gain === undefined || design.compensator.gain === gain) return;
    this.design = { ...design, compensator: { ...design.compensator, gain } };
    this.#tellDesign();
  }

  setConnection(/** @type {"open" | "lost"} */ state) {
    if (this.connection === state) return;
    this.connection = state;
    this.#tell("connection", { state });
  }

  // ---- keeping the work ----------------------------------------------------------------------------

  /** What a reload needs to go on as if nothing had happened. @param {number} steps most steps each way */
  snapshot(steps = 50) {
    return {
      design: this.holding?.design ?? this.design,
      origin: this.origin,
      pinned: this.pinned?.design ?? null,
      past: this.#past.slice(-steps),
      future: this.#future.slice(-steps),
    };
  }

  /** @param {ReturnType<Store["snapshot"]>} work */
  restore(work) {
    this.#past = work.past ?? [];
    this.#future = work.future ?? [];
    this.origin = work.origin ?? { kind: "file" };
    this.pinned = work.pinned ? { design: work.pinned, frame: null } : null;
    this.#show(/** @type {Design} */ (work.design));
    this.#tell("history");
    this.#tell("pinned");
    this.#tell("loaded", this.origin);
  }

  // ---------------------------------------------------------------------------------------------------

  #show(/** @type {Design} */ design, /** @type {Aim | undefined} */ aim = undefined) {
    this.design = design;
    this.ask(aim);
    this.#tellDesign();
  }

  #tellDesign() {
    clearTimeout(this.#untold);
    this.#untold = 0;
    this.#tell("design");
  }

  #tell(/** @type {string} */ type, /** @type {any} */ detail = null) {
    this.dispatchEvent(new CustomEvent(type, { detail }));
  }
}
