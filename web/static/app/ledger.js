import { copyNotice } from "./copy_notice.js";
import { moved, removedAt, replacedAt, withRequirements } from "./design_edits.js";
import { el, setText, textButton } from "./element.js";
import { judgedEdit } from "./judged_edit.js";
import { requirementEditor } from "./requirement_editor.js";
import { requirementRow, sentence } from "./requirement_row.js";
import { measureFacts } from "./requirement_words.js";

/** A pause in the changes after which the verdict is read out. */
const REST_MS = 700;

/**
 * The requirement ledger: the verdict in one sentence, then a row a requirement.
 *
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 */
export function ledger(root, store) {
  const count = el("h2", { class: "verdict" });
  const rest = el("p", { class: "verdict-rest" });
  const list = el("ol", { class: "requirements" });
  const empty = el("p", { class: "empty", text: "Say what the loop has to do; every move is then judged against it." });
  const spoken = el("output", { class: "visually-hidden", role: "status" });
  const actions = rowActions(store, focusRow);
  const editor = requirementEditor(document.body, store);
  const add = textButton("+ add a requirement", () => editor.open(null), { class: "adds" });
  root.replaceChildren(copyNotice(store), el("div", { class: "verdict-lines" }, count, rest), list, empty, add, spoken);

  let rows = [];
  let drawn = null;

  function drawRows() {
    const requirements = store.design?.requirements ?? [];
    if (requirements === drawn) return;
    const open = new Set(drawn ? openMeasures(list, drawn) : []);
    const focused = focusedPlace(list);
    drawn = requirements;
    rows = requirements.map((requirement, index) => requirementRow(store, index, requirement, { ...actions, edit: editor.open }));
    list.replaceChildren(...rows.map((row) => row.node));
    requirements.forEach((one, index) => open.has(keyOf(one)) && rows[index].node.querySelector(".requirement-measure").click());
    empty.hidden = requirements.length > 0 || !store.design;
    drawValues();
    if (focused) restoreFocus(list, focused);
  }

  function drawValues() {
    const assessment = store.lastGood?.assessment;
    const pinned = store.pinned?.frame?.assessment;
    const requirements = drawn ?? [];
    rows.forEach((row, index) => row.update(rowOf(assessment, requirements[index], index), rowOf(pinned, requirements[index], index, true)));
    root.classList.toggle("has-pinned", Boolean(pinned));
    drawVerdict(assessment);
  }

  function drawVerdict(assessment) {
    root.dataset.verdict = assessment && rows.length === 0 ? "empty" : assessment?.verdict ?? "";
    const [head, more] = assessment ? splitHeadline(assessment.headline) : ["", ""];
    setText(count, head || (store.design ? "Reading the loop…" : "No design is open"));
    setText(rest, more);
    speakLater(`${head}${more ? `: ${more}` : ""}`);
  }

  let timer = 0;
  function speakLater(text) {
    clearTimeout(timer);
    timer = setTimeout(() => setText(spoken, text), REST_MS);
  }

  function focusRow(index) {
    store.setUi({ focusedRow: index });
  }

  store.addEventListener("design", drawRows);
  store.addEventListener("frame", drawValues);
  store.addEventListener("pinned", drawValues);
  store.addEventListener("catalogue", drawValues);
  store.addEventListener("ui", (event) => {
    if (event.detail && "unit" in event.detail) drawValues();
    const focused = store.ui.focusedRow;
    rows.forEach((row, index) => row.node.classList.toggle("is-focused", index === focused));
  });
  drawRows();
  drawVerdict(null);
}

/** "5 of 7 met: phase margin is short." as its two lines. */
function splitHeadline(headline) {
  const colon = headline.indexOf(": ");
  return colon < 0 ? [headline.replace(/\.$/, ""), ""] : [headline.slice(0, colon), sentence(headline.slice(colon + 2))];
}

/** The assessment's row for a requirement; an older frame may still have other rows at that place. */
function rowOf(assessment, requirement, index, anywhere = false) {
  const rows = assessment?.requirements ?? [];
  const fits = (row) => row && keyOf(row) === keyOf(requirement);
  if (fits(rows[index])) return rows[index];
  return anywhere ? rows.find(fits) ?? null : null;
}

const keyOf = (requirement) =>
  JSON.stringify([requirement.measure, requirement.at_rad_s ?? null, requirement.over_rad_s ?? null, Boolean(requirement.mask)]);

function openMeasures(list, requirements) {
  return [...list.children]
    .filter((node) => node.querySelector("[aria-expanded=true]"))
    .map((node) => keyOf(requirements[Number(node.dataset.row)]));
}

function focusedPlace(list) {
  const row = document.activeElement?.closest?.(".requirement");
  if (!row || !list.contains(row)) return null;
  const focusable = [...row.querySelectorAll("button, input")];
  return { row: Number(row.dataset.row), at: focusable.indexOf(document.activeElement), act: document.activeElement.dataset.act };
}

function restoreFocus(list, { row, at, act }) {
  const node = list.children[Math.min(row, list.children.length - 1)];
  if (!node) return;
  (act && node.querySelector(`[data-act="${act}"]:not(:disabled)`) || node.querySelectorAll("button")[Math.max(at, 0)] || node.querySelector("button"))?.focus();
}

function rowActions(store, focus) {
  const label = (index) => measureFacts(store.measures, store.design.requirements[index].measure).label;
  return {
    focus,
    async keepLimit(index, side, value) {
      const change = (design) => withRequirements(design, (list) => replacedAt(list, index, { ...list[index], [side]: value }));
      const faults = await judgedEdit(store, `limit of ${label(index)}`, change);
      return faults[0]?.what ?? null;
    },
    move(index, to) {
      store.edit(`move ${label(index)}`, (design) => withRequirements(design, (list) => moved(list, index, to)));
      document.querySelector(`.requirement[data-row="${to}"] .requirement-measure`)?.focus();
    },
    remove(index) {
      const name = label(index);
      store.edit(`remove ${name}`, (design) => withRequirements(design, (list) => removedAt(list, index)));
      store.say(`${name} removed; undo brings it back`);
    },
  };
}
