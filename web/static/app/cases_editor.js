import { caseRenamed, insertedAt, replacedAt, withCases } from "./design_edits.js";
import { el, textButton } from "./element.js";
import { field, placeFaults, textInput } from "./field.js";
import { modelEntry } from "./model_entry.js";
import { judgedEdit } from "./judged_edit.js";
import { sheet } from "./sheet.js";

/**
 * Add or change a plant case: its name and its model.
 *
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 * @returns {{open: (index: number|null, start?: object) => void}} null adds one, starting from `start`
 */
export function caseEditor(root, store) {
  const window_ = sheet(root, { title: "plant case", class: "case-sheet keeps-open" });
  const name = textInput("", { maxlength: 120, placeholder: "heavy payload" });
  const nameField = field("name of the case", name);
  const entry = modelEntry();
  const rest = el("p", { class: "fault", role: "alert" });
  const form = el("form", { class: "form", novalidate: true, on: { submit: keep } }, nameField.node, entry.node, rest);
  window_.body.append(form);
  const keepButton = el("button", { type: "button", class: "strong", on: { click: () => form.requestSubmit() } });
  window_.foot.append(keepButton, textButton("cancel", () => window_.close(), { class: "quiet" }));
  let index = null;

  async function keep(event) {
    event?.preventDefault();
    nameField.setFault(null);
    rest.textContent = "";
    const model = entry.read();
    if (name.value.trim() === "") nameField.setFault("needs a name");
    if (!model || nameField.fault()) return form.querySelector("[aria-invalid=true]")?.focus();
    const at = index ?? store.design.plant_cases.length;
    const change = changeTo(at, { name: name.value.trim(), model });
    const faults = await judgedEdit(store, `${index === null ? "add" : "change"} ${name.value.trim()}`, change);
    if (faults.length > 0) {
      await entry.settled();
      return placeFaults(new Map([["name", nameField], ...entry.fields()]), faults, `plant_cases[${at}]`, rest);
    }
    window_.close(() => document.querySelector(`[data-case="${at}"] [data-act="edit"]`)?.focus());
  }

  function changeTo(at, written) {
    if (index === null) return (design) => withCases(design, (list) => insertedAt(list, at, written));
    return (design) => {
      const old = design.plant_cases[at];
      const next = withCases(design, (list) => replacedAt(list, at, { ...old, ...written }));
      return old.name === written.name ? next : caseRenamed(next, old.name, written.name);
    };
  }

  return {
    open(which, start) {
      index = which;
      const shown = start ?? store.design.plant_cases[which];
      name.value = shown.name;
      nameField.setFault(null);
      rest.textContent = "";
      keepButton.textContent = which === null ? "add case" : "keep";
      window_.open(which === null ? "a new plant case" : shown.name);
      entry.set(shown.model);
      name.focus();
      name.select();
    },
  };
}
