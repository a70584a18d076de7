import { caseRenamed, freeName, moved, removedAt, withCases } from "./design_edits.js";
import { caseEditor } from "./cases_editor.js";
import { el, setText, textButton } from "./element.js";
import { modelText } from "./model_text.js";
import { measureFacts, readingText, unitOf } from "./requirement_words.js";

/** The readings that tell cases apart at a glance. */
const KEY_READINGS = ["crossover_rad_s", "phase_margin_deg", "gain_margin_db", "peak_sensitivity", "overshoot_pct"];

/**
 * The plants that the one compensator must serve.
 *
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 * @returns {import("./drawer.js").Tab}
 */
export function casesTab(root, store) {
  const editor = caseEditor(document.body, store);
  const heads = KEY_READINGS.map((measure) => ({ measure, node: el("th", { scope: "col", class: "number" }) }));
  const body = el("tbody");
  const table = el("table", { class: "quiet-table cases-table" },
    el("caption", { class: "visually-hidden", text: "plant cases; the first is the nominal one" }),
    el("thead", {}, el("tr", {}, el("th", { scope: "col", text: "case" }), el("th", { scope: "col", text: "model" }),
      el("th", { scope: "col", text: "closed loop" }), ...heads.map(({ node }) => node), el("th", { scope: "col" }, el("span", { class: "visually-hidden", text: "actions" })))),
    body);
  const add = textButton("+ add a plant case", () => editor.open(null, {
    name: freeName("another case", names()), model: { kind: "expression", text: "" },
  }), { class: "adds" });
  root.append(el("div", { class: "table-scroll", tabindex: "0", role: "region", "aria-label": "plant cases" }, table), add);

  const names = () => (store.design?.plant_cases ?? []).map((one) => one.name);
  let drawn = null;
  let rows = [];

  function draw() {
    const cases = store.design?.plant_cases ?? [];
    if (cases !== drawn) {
      const act = body.contains(document.activeElement) ? document.activeElement.dataset : null;
      const place = act ? [act.act, Number(document.activeElement.closest("tr").dataset.case)] : null;
      drawn = cases;
      rows = cases.map((one, index) => caseRow(store, one, index, cases.length, { edit: editor.open, names }));
      body.replaceChildren(...rows.map((row) => row.node));
      if (place) body.children[Math.min(place[1], cases.length - 1)]?.querySelector(`[data-act="${place[0]}"]:not(:disabled), [data-act="edit"]`)?.focus();
    }
    heads.forEach(({ measure, node }) => setText(node, measureFacts(store.measures, measure).label));
    const assessed = store.lastGood?.assessment.cases ?? [];
    rows.forEach((row, index) => row.update(assessed[index]?.name === cases[index].name ? assessed[index] : null));
  }

  return { draw };
}

function caseRow(store, one, index, count, { edit, names }) {
  const model = el("td", { class: "mono case-model" });
  const stability = el("td", { class: "case-stability" });
  const readings = KEY_READINGS.map((measure) => ({ measure, node: el("td", { class: "number" }) }));
  const act = (word, key, run, disabled = false) => textButton(word, run, { "aria-label": `${word} ${one.name}`, data: { act: key }, disabled });
  const change = (label, edited) => store.edit(label, edited);
  const node = el("tr", { data: { case: index } },
    el("th", { scope: "row" }, one.name, index === 0 ? el("span", { class: "tag", text: "nominal" }) : null),
    model, stability, ...readings.map((reading) => reading.node),
    el("td", { class: "row-actions" },
      act("edit", "edit", () => edit(index)),
      act("copy", "copy", () => edit(null, { name: freeName(`${one.name}, copy`, names()), model: one.model })),
      index === 0 ? null : act("make nominal", "nominal", () => change(`${one.name} as nominal`, (design) => withCases(design, (list) => moved(list, index, 0)))),
      act("remove", "remove", () => {
        change(`remove ${one.name}`, (design) => caseRenamed(withCases(design, (list) => removedAt(list, index)), one.name, null));
        store.say(`${one.name} removed; undo brings it back`);
      }, count === 1)));
  modelText(one.model).then((text) => {
    model.textContent = text;
    model.title = text;
  });
  return {
    node,
    update(assessed) {
      setText(stability, assessed ? assessed.stability : "…");
      stability.classList.toggle("is-short", assessed?.stable === false);
      for (const { measure, node: cell } of readings) {
        const reading = assessed?.readings[measure];
        setText(cell, assessed ? readingText(reading, unitOf(store, measure), store.ui.unit) : "…");
        cell.title = reading?.why ?? "";
      }
    },
  };
}
