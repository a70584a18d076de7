import { el, setText, textButton } from "./element.js";
import { exactNumber } from "./exact_number.js";
import { exact, number } from "./format.js";
import { draggableRow } from "./reorder.js";
import { isLead, sentenceOf, stageName, tradeName } from "./stages_words.js";
import { typedNumber } from "./typed_number.js";
import { fromShown, toShown } from "./units.js";

/**
 * @typedef {object} StageActions
 * @property {(index: number, field: string, value: number) => Promise<string|null>} keep
 * @property {(from: number, to: number) => void} move
 * @property {(index: number) => void} toggle rest or wake
 * @property {(index: number) => void} remove
 * @property {(index: number) => void} copy
 * @property {(index: number, name: string) => void} rename
 * @property {(index: number) => void} exactNumbers
 * @property {(index: number|null) => void} focus
 */

/** Two stages with the same shape are drawn by the same row. */
export const shapeOf = (stage) => JSON.stringify([
  stage.kind, stage.enabled !== false, stage.name ?? "", stage.kind === "lead_lag" && isLead(stage),
  stage.kind === "rational" && [stage.zeros?.length, stage.poles?.length],
]);

/**
 * One stage as a sentence with numbers that can be typed.
 *
 * @param {import("./store.js").Store} store
 * @param {number} index
 * @param {object} stage
 * @param {StageActions} actions
 * @param {() => HTMLElement[]} rows
 */
export function stageRow(store, index, stage, actions, rows) {
  const called = stageName(stage);
  const awake = stage.enabled !== false;
  const parts = sentenceOf(stage).map((part) => builtPart(store, index, part, called, actions));
  const nameSlot = el("span", { class: "stage-name" }, ownName(stage));
  const grip = el("button", { type: "button", class: "grip", "aria-label": `move ${called}: drag, or arrow keys up and down`, title: "drag to another place" });
  const act = (word, run, key, more = {}) => textButton(word, run, { "aria-label": `${word} ${called}`, data: { act: key }, ...more });
  const seldom = (word, run, key) => act(word, run, key, { class: "seldom" });
  const count = store.design.compensator.stages.length;
  const row = el("li", { class: `stage-row${awake ? "" : " is-resting"}`, data: { stage: index } },
    grip,
    el("span", { class: "stage-sentence" }, nameSlot, ...parts.map((part) => part.node), awake ? "" : ", resting"),
    el("span", { class: "stage-actions" },
      seldom("rename", () => renameIn(nameSlot, stage, (name) => actions.rename(index, name)), "rename"),
      seldom("copy", () => actions.copy(index), "copy"),
      seldom("all numbers", () => actions.exactNumbers(index), "numbers"),
      textButton("↑", () => actions.move(index, index - 1), { "aria-label": `move ${called} up`, disabled: index === 0, class: "arrow", data: { act: "up" } }),
      textButton("↓", () => actions.move(index, index + 1), { "aria-label": `move ${called} down`, disabled: index === count - 1, class: "arrow", data: { act: "down" } }),
      act(awake ? "rest" : "wake", () => actions.toggle(index), "toggle"),
      act("remove", () => actions.remove(index), "remove")));
  draggableRow(grip, { row, rows, move: actions.move });
  row.addEventListener("pointerenter", () => actions.focus(index));
  row.addEventListener("pointerleave", () => actions.focus(null));
  row.addEventListener("focusin", () => actions.focus(index));
  row.addEventListener("focusout", (event) => row.contains(event.relatedTarget) || actions.focus(null));
  return {
    node: row,
    update: (now, facts) => parts.forEach((part) => part.update(now, facts)),
  };
}

/** A name that only repeats what the trade calls the stage is not said twice. */
function ownName(stage) {
  return stage.name && stage.name.toLowerCase() !== tradeName(stage) ? `${stage.name}, ` : "";
}

function builtPart(store, index, part, called, actions) {
  if (typeof part === "string") return { node: el("span", { text: part }), update() {} };
  if (typeof part === "function") {
    const node = el("span");
    return { node, update: (_stage, facts) => setText(node, part(facts, store.ui.unit)) };
  }
  const unit = () => (part.frequency ? store.ui.unit : "rad/s");
  const typed = exactNumber({
    name: `${part.what} of ${called}${part.frequency ? `, ${store.ui.unit}` : ""}`,
    show: (value) => number(toShown(value, unit())),
    typed: (value) => exact(toShown(value, unit())),
    read: (text) => fromShown(typedNumber(text), unit()),
    keep: (value) => actions.keep(index, part.number, value),
  });
  const glyph = part.glyph ? el("span", { class: "glyph", text: part.glyph, "aria-hidden": "true" }) : null;
  return {
    node: el("span", { class: "stage-number" }, glyph, typed.node),
    update: (stage) => typed.update(stage[part.number] ?? (part.number === "gain" ? 1 : undefined)),
  };
}

function renameIn(slot, stage, keep) {
  const before = [...slot.childNodes];
  const input = el("input", { type: "text", class: "field", value: stage.name ?? "", "aria-label": "name of the stage", maxlength: 120, size: 14 });
  let open = true;
  const close = (name) => {
    if (!open) return;
    open = false;
    slot.replaceChildren(...before);
    if (name !== null && name !== (stage.name ?? "")) keep(name);
  };
  input.addEventListener("keydown", (event) => {
    if (event.key === "Enter") close(input.value.trim());
    else if (event.key === "Escape") close(null);
  });
  input.addEventListener("blur", () => close(input.value.trim()));
  slot.replaceChildren(input);
  input.focus();
  input.select();
}
