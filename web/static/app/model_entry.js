import { el, freshId } from "./element.js";
import { field, placeFaults, textInput } from "./field.js";
import { exact } from "./format.js";
import { MODEL_FORMS } from "./model_forms.js";
import { modelReading } from "./model_reading.js";
import { ask } from "./request.js";
import { numberFault, typedNumberOrNone } from "./typed_number.js";

/** A pause in the typing after which the server reads the model. */
const READ_AFTER_MS = 220;

/**
 * Enter a model in any of its forms, and see at once how it is read.
 *
 * @returns {{node: HTMLElement, set: (model: object) => void, read: () => object|null,
 *   settled: () => Promise<boolean>, fields: () => [string, import("./field.js").Field][]}}
 *   `read` gives the model as typed, or null where a field holds no number (and says so beside it)
 */
export function modelEntry() {
  const group = freshId("model-kind");
  const kinds = el("div", { class: "segments", role: "radiogroup" }, ...MODEL_FORMS.map(({ kind, label }) =>
    el("label", { class: "segment" },
      el("input", { type: "radio", name: group, value: kind, on: { change: () => choose(kind) } }), el("span", { text: label }))));
  const deadTime = textInput("", { inputmode: "decimal", placeholder: "0" });
  const deadTimeField = field("dead time, s", deadTime, { hint: "left empty: none" });
  const slot = el("div", { class: "model-fields" });
  const rest = el("p", { class: "fault", role: "alert" });
  const reading = modelReading();
  const node = el("div", { class: "model-entry" },
    el("div", { class: "model-typed" }, field("given as", kinds, { group: true }).node, slot, deadTimeField.node, rest), reading.node);
  const drafts = new Map(MODEL_FORMS.map((form) => [form.kind, form.build()]));
  let current = "expression";
  let parsed = null;
  let ticket = 0;
  let timer = 0;
  let judging = Promise.resolve(false);

  node.addEventListener("input", () => soon());

  function choose(kind) {
    const before = current;
    current = kind;
    const draft = drafts.get(kind);
    // What was read so far is carried over into an empty form that can hold it.
    if (before !== kind && draft.isEmpty() && parsed) draft.fill?.(parsed);
    show();
    soon();
  }

  function show() {
    for (const input of kinds.querySelectorAll("input")) input.checked = input.value === current;
    slot.replaceChildren(...drafts.get(current).fields.map(([, one]) => one.node));
  }

  function allFields() {
    return [...drafts.get(current).fields, ["dead_time_s", deadTimeField]];
  }

  function clear() {
    for (const [, one] of allFields()) one.setFault(null);
    drafts.get(current).point?.(null);
    rest.textContent = "";
  }

  function read({ quietly = false } = {}) {
    if (!quietly) clear();
    const { model, faults } = drafts.get(current).read();
    const delay = typedNumberOrNone(deadTime.value);
    const wrong = delay === undefined ? null : numberFault(deadTime.value, delay);
    if (!quietly) {
      for (const [name, what] of faults) drafts.get(current).fields.find(([path]) => path === name)[1].setFault(what);
      if (wrong) deadTimeField.setFault(wrong);
    }
    if (faults.length > 0 || wrong) return null;
    return delay === undefined ? model : { ...model, dead_time_s: delay };
  }

  function soon() {
    clearTimeout(timer);
    timer = setTimeout(() => { judging = judge(); }, READ_AFTER_MS);
  }

  /** @returns {Promise<boolean>} whether the server could read the model */
  async function judge() {
    clearTimeout(timer);
    ticket += 1;
    const mine = ticket;
    if (drafts.get(current).isEmpty()) {
      clear();
      parsed = null;
      reading.wait();
      return false;
    }
    const model = read();
    if (!model) {
      reading.fail();
      return false;
    }
    reading.busy();
    const answer = await ask("POST", "/api/models", { model });
    if (mine !== ticket) return judging;
    clear();
    if (answer.ok) {
      parsed = answer.body;
      reading.show(parsed);
      return true;
    }
    reading.fail();
    const focused = document.activeElement;
    placeFaults(new Map(allFields()), answer.errors, "", rest);
    drafts.get(current).point?.(answer.errors);
    focused?.focus?.();
    return false;
  }

  return {
    node,
    set(model) {
      current = model.kind;
      parsed = null;
      for (const draft of drafts.values()) draft.set(null);
      drafts.get(current).set(model);
      deadTime.value = model.dead_time_s ? exact(model.dead_time_s) : "";
      clear();
      show();
      reading.wait();
      judging = judge();
    },
    read,
    settled() {
      judging = judge();
      return judging;
    },
    fields: () => allFields().map(([name, one]) => [`model.${name}`, one]),
  };
}
