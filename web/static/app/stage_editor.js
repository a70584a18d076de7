import { insertedAt, replacedAt, withStages } from "./design_edits.js";
import { el, textButton } from "./element.js";
import { choice, field, placeFaults, textInput } from "./field.js";
import { judgedEdit } from "./judged_edit.js";
import { sheet } from "./sheet.js";
import { STAGE_FORMS } from "./stage_forms.js";
import { stageName } from "./stages_words.js";

/**
 * A stage of any kind by its exact numbers.
 *
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 * @param {(index: number) => void} kept
 * @returns {{open: (index: number|null) => void}} null adds one
 */
export function stageEditor(root, store, kept) {
  const window_ = sheet(root, { title: "stage", class: "stage-sheet keeps-open" });
  const kind = choice(STAGE_FORMS.map(({ kind: k, label }) => [k, label]), "lead_lag", { on: { change: () => draw({}) } });
  const kindField = field("kind", kind);
  const formula = el("p", { class: "mono formula" });
  const name = textInput("", { maxlength: 120 });
  const nameField = field("name", name, { hint: "left empty: what the trade calls it" });
  const slot = el("div", { class: "form" });
  const rest = el("p", { class: "fault", role: "alert" });
  const form = el("form", { class: "form", novalidate: true, on: { submit: keep } }, kindField.node, formula, slot, nameField.node, rest);
  window_.body.append(form);
  const keepButton = el("button", { type: "button", class: "strong", on: { click: () => form.requestSubmit() } });
  window_.foot.append(keepButton, textButton("cancel", () => window_.close(), { class: "quiet" }));
  let index = null;
  let parts = [];

  const chosen = () => STAGE_FORMS.find((one) => one.kind === kind.value);

  function draw(stage) {
    formula.textContent = chosen().formula;
    rest.textContent = "";
    kindField.setFault(null);
    parts = chosen().parts.map((part) => {
      const control = textInput(part.path in stage ? part.write(stage[part.path], store.ui.unit) : part.start ?? "", { class: "field mono" });
      return { ...part, control, field: field(part.label(store.ui.unit), control, { hint: part.hint }) };
    });
    slot.replaceChildren(...parts.map((part) => part.field.node));
  }

  function read() {
    const stage = { kind: kind.value };
    let ok = true;
    for (const part of parts) {
      const answer = part.read(part.control.value, store.ui.unit);
      part.field.setFault(answer.ok ? null : answer.what);
      if (answer.ok) stage[part.path] = answer.value;
      else ok = false;
    }
    if (name.value.trim()) stage.name = name.value.trim();
    if (index !== null && store.design.compensator.stages[index].enabled === false) stage.enabled = false;
    return ok ? stage : null;
  }

  async function keep(event) {
    event.preventDefault();
    const stage = read();
    if (!stage) return form.querySelector("[aria-invalid=true]")?.focus();
    const at = index ?? (store.design.compensator.stages ?? []).length;
    const change = (list) => (index === null ? insertedAt(list, at, stage) : replacedAt(list, at, stage));
    const label = `${index === null ? "add" : "change"} ${stageName(stage)}`;
    const faults = await judgedEdit(store, label, (design) => withStages(design, change));
    if (faults.length > 0) {
      const fields = new Map([["kind", kindField], ["name", nameField], ...parts.map((part) => [part.path, part.field])]);
      return placeFaults(fields, faults, `compensator.stages[${at}]`, rest);
    }
    window_.close(() => kept(at));
  }

  return {
    open(which) {
      if (!store.design) return;
      index = which;
      const stage = which === null ? { kind: "lead_lag" } : store.design.compensator.stages[which];
      kind.value = stage.kind;
      name.value = stage.name ?? "";
      draw(stage);
      keepButton.textContent = which === null ? "add stage" : "keep";
      window_.open(which === null ? "a stage by its numbers" : stageName(stage));
      (which === null ? kind : parts[0]?.control ?? name).focus();
    },
  };
}
