import { insertedAt, withGain, withStages } from "./design_edits.js";
import { el, textButton } from "./element.js";
import { ask } from "./request.js";
import { stageName } from "./stages_words.js";

/** What a stage can be wanted for; the server puts a sensible one at a sensible place. */
const PURPOSES = [
  ["add phase", "add phase at the crossover"],
  ["hold against load", "hold against load"],
  ["quiet a resonance", "quiet a resonance"],
  ["roll off noise", "roll off noise"],
  ["bare corner", "a bare corner"],
];

/**
 * @param {import("./store.js").Store} store
 * @param {{byNumbers: () => void, added: (index: number) => void}} actions
 */
export function stagesAdd(store, { byNumbers, added }) {
  const said = el("p", { class: "stages-why", role: "status" });
  const buttons = PURPOSES.map(([purpose, words]) => textButton(words, (event) => add(purpose, event.currentTarget), { class: "adds" }));

  async function add(purpose, button) {
    const design = store.design;
    if (!design) return;
    button.disabled = true;
    const answer = await ask("POST", "/api/stages", { design, purpose });
    button.disabled = false;
    said.classList.toggle("fault", !answer.ok);
    if (!answer.ok) {
      said.textContent = answer.errors.map(({ what }) => what).join("; ");
      button.focus();
      return;
    }
    const { stage, gain, why } = answer.body;
    const at = store.design.compensator.stages?.length ?? 0;
    store.edit(`add ${stageName(stage)}`, (now) => {
      const next = withStages(now, (list) => insertedAt(list, at, stage));
      return typeof gain === "number" ? withGain(next, gain) : next;
    });
    said.textContent = why ?? "";
    added(at);
  }

  const line = el("div", { class: "stages-add" }, el("span", { class: "plus", "aria-hidden": "true", text: "+" }),
    ...buttons.flatMap((button) => [button, el("span", { class: "dot", "aria-hidden": "true", text: "·" })]),
    textButton("a stage by its numbers", () => byNumbers(), { class: "adds" }));
  return { node: el("div", {}, line, said), clear: () => { said.textContent = ""; } };
}
