import { insertedAt, moved, removedAt, replacedAt, withField, withStages } from "./design_edits.js";
import { el } from "./element.js";
import { judgedEdit } from "./judged_edit.js";
import { stageEditor } from "./stage_editor.js";
import { stagesAdd } from "./stages_add.js";
import { gainRow } from "./stages_gain.js";
import { shapeOf, stageRow } from "./stages_row.js";
import { stageName } from "./stages_words.js";

/**
 * The compensator as sentences.
 *
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 * @returns {import("./drawer.js").Tab}
 */
export function stagesTab(root, store) {
  const gain = gainRow(store);
  const list = el("ol", { class: "stage-rows" });
  const empty = el("p", { class: "empty", text: "The compensator is a plain gain. Say what the loop lacks, and a stage for it is put in place:" });
  const editor = stageEditor(document.body, store, (index) => focusRow(index));
  const add = stagesAdd(store, { byNumbers: () => editor.open(null), added: (index) => focusRow(index) });
  const actions = { ...stageActions(store), exactNumbers: editor.open, focus: (index) => store.setUi({ focusedStage: index }) };
  root.append(list, empty, add.node);

  let rows = [];
  let shape = null;

  function draw(changed) {
    const stages = store.design?.compensator.stages ?? [];
    const now = `${store.ui.unit}${stages.map(shapeOf).join()}`;
    if (now !== shape) {
      const focused = focusedPlace(list);
      shape = now;
      rows = stages.map((stage, index) => stageRow(store, index, stage, actions, () => [...list.querySelectorAll("[data-stage]")]));
      list.replaceChildren(gain.node, ...rows.map((row) => row.node));
      if (focused) restoreFocus(list, focused);
    }
    empty.hidden = stages.length > 0 || !store.design;
    list.hidden = !store.design;
    gain.update();
    const facts = store.lastGood?.assessment.stages ?? [];
    rows.forEach((row, index) => row.update(stages[index], facts[index]?.kind === stages[index].kind ? facts[index] : null));
    const focusedStage = store.ui.focusedStage;
    rows.forEach((row, index) => row.node.classList.toggle("is-focused", index === focusedStage));
    if (changed === "shown") add.clear();
  }

  function focusRow(index) {
    list.querySelector(`[data-stage="${index}"] .exact-number, [data-stage="${index}"] .grip`)?.focus();
  }

  return { draw };
}

function stageActions(store) {
  const called = (index) => stageName(store.design.compensator.stages[index]);
  const edit = (label, change) => store.edit(label, (design) => withStages(design, change));
  return {
    async keep(index, field, value) {
      const change = (list) => replacedAt(list, index, { ...list[index], [field]: value });
      const label = `${field.replace(/_rad_s$/, "").replaceAll("_", " ")} of ${called(index)}`;
      const faults = await judgedEdit(store, label, (design) => withStages(design, change));
      return faults[0]?.what ?? null;
    },
    move(from, to) {
      edit(`move ${called(from)}`, (list) => moved(list, from, to));
      document.querySelector(`[data-stage="${to}"] .grip`)?.focus();
    },
    toggle(index) {
      const awake = store.design.compensator.stages[index].enabled !== false;
      edit(`${awake ? "rest" : "wake"} ${called(index)}`, (list) => replacedAt(list, index, withField(list[index], "enabled", awake ? false : undefined)));
    },
    remove(index) {
      const name = called(index);
      edit(`remove ${name}`, (list) => removedAt(list, index));
      store.say(`${name} removed; undo brings it back`);
    },
    copy: (index) => edit(`copy ${called(index)}`, (list) => insertedAt(list, index + 1, { ...list[index] })),
    rename: (index, name) => edit(`rename ${called(index)}`, (list) => replacedAt(list, index, withField(list[index], "name", name || undefined))),
  };
}

function focusedPlace(list) {
  const row = document.activeElement?.closest?.("[data-stage]");
  if (!row || !list.contains(row)) return null;
  return { index: Number(row.dataset.stage), act: document.activeElement.dataset.act ?? null };
}

function restoreFocus(list, { index, act }) {
  const rows = list.querySelectorAll("[data-stage]");
  const row = rows[Math.min(index, rows.length - 1)] ?? list;
  (act && row.querySelector(`[data-act="${act}"]:not(:disabled)`) || row.querySelector("button"))?.focus();
}
