import { el, freshId, setText, textButton } from "./element.js";
import { exact } from "./format.js";
import { exactNumber } from "./exact_number.js";
import { bareText, limitText, measureFacts, measureText, readingText, standing, unitOf, whereRead } from "./requirement_words.js";
import { slackBar } from "./slack_bar.js";
import { typedNumber } from "./typed_number.js";
import { fromShown, toShown } from "./units.js";

/**
 * One row of the ledger.
 *
 * @typedef {object} RowActions
 * @property {(index: number, side: "at_least"|"at_most", value: number) => Promise<string|null>} keepLimit
 * @property {(index: number) => void} edit
 * @property {(index: number, to: number) => void} move
 * @property {(index: number) => void} remove
 * @property {(index: number|null) => void} focus
 *
 * @param {import("./store.js").Store} store
 * @param {number} index
 * @param {object} requirement
 * @param {RowActions} actions
 */
export function requirementRow(store, index, requirement, actions) {
  const facts = () => measureFacts(store.measures, requirement.measure);
  const moreId = freshId("requirement-more");
  const measure = el("button", {
    type: "button", class: "requirement-measure", "aria-expanded": "false", "aria-controls": moreId, on: { click: toggle },
  });
  const limits = limitNumbers(store, index, requirement, facts, actions);
  const worst = el("span", { class: "requirement-worst" });
  const was = el("span", { class: "requirement-was" });
  const caseName = el("span", { class: "requirement-case" });
  const bar = slackBar();
  const told = el("div");
  const more = el("div", { class: "requirement-more", id: moreId, hidden: true }, told, rowButtons(store, requirement, index, actions));
  const node = el("li", { class: "requirement", data: { row: index } },
    el("div", { class: "requirement-line" }, measure, limits.node),
    el("div", { class: "requirement-line" }, el("span", { class: "requirement-values" }, worst, was), caseName),
    bar.node, more);
  node.addEventListener("pointerenter", () => actions.focus(index));
  node.addEventListener("pointerleave", () => actions.focus(null));
  node.addEventListener("focusin", () => actions.focus(index));
  node.addEventListener("focusout", (event) => {
    if (!node.contains(event.relatedTarget)) actions.focus(null);
  });

  function toggle() {
    more.hidden = !more.hidden;
    measure.setAttribute("aria-expanded", String(!more.hidden));
    update();
  }

  let last = { verdict: null, pinned: null };

  /** @param {object|null} [verdict] its row of the assessment @param {object|null} [pinned] that of the pinned design */
  function update(verdict = last.verdict, pinned = last.pinned) {
    last = { verdict, pinned };
    const { unit } = store.ui;
    const state = standing(verdict);
    const ruleUnit = unitOf(store, requirement.measure);
    const rank = requirement.rank === "should" ? ", should" : "";
    setText(measure, measureText(requirement, facts().label, unit) + rank);
    limits.update();
    setText(worst, verdict ? readingText(verdict.reading, ruleUnit, unit) : "…");
    setText(was, pinned ? bareText(pinned.reading, ruleUnit, unit) : "");
    was.title = pinned ? `pinned, on ${pinned.case}` : "";
    setText(caseName, verdict?.case ?? "");
    caseName.title = verdict?.case ?? "";
    node.dataset.standing = state;
    bar.update({ standing: state, slack: verdict?.slack, pinned: pinned?.slack });
    if (!more.hidden) drawFacts(told, store, requirement, verdict, ruleUnit);
  }

  return { node, update };
}

function limitNumbers(store, index, requirement, facts, actions) {
  if (requirement.mask) {
    const button = textButton("mask", () => actions.edit(index), { "aria-label": `mask of ${facts().label}, change` });
    return { node: el("span", { class: "requirement-limit" }, button), update() {} };
  }
  const inRadians = () => facts().unit === "rad/s";
  const numbers = [["at_least", "≥"], ["at_most", "≤"]].filter(([side]) => requirement[side] !== undefined && requirement[side] !== null)
    .map(([side, sign], place, all) => {
      const last = place === all.length - 1; // with a limit on either side, one unit is enough
      const number = exactNumber({
        name: `${facts().label}, ${side === "at_least" ? "at least" : "at most"}`,
        show: (value) => `${sign} ${limitText(value, unitOf(store, requirement.measure), store.ui.unit, last)}`,
        typed: (value) => exact(inRadians() ? toShown(value, store.ui.unit) : value),
        read: (text) => (inRadians() ? fromShown(typedNumber(text), store.ui.unit) : typedNumber(text)),
        keep: (value) => actions.keepLimit(index, side, value),
      });
      return { side, number };
    });
  return {
    node: el("span", { class: "requirement-limit" }, ...numbers.map(({ number }) => number.node)),
    update: () => numbers.forEach(({ side, number }) => number.update(requirement[side])),
  };
}

/** Why the row is there, where it is read, and how every case stands. */
function drawFacts(told, store, requirement, verdict, unit) {
  const shown = store.ui.unit;
  const at = whereRead(verdict?.reading, shown);
  const lines = [
    verdict?.shortfall ? el("p", { class: "requirement-short", text: sentence(verdict.shortfall) }) : null,
    verdict?.reading?.why ? el("p", { text: sentence(verdict.reading.why) }) : null,
    at ? el("p", { text: `Read ${at}${verdict.case ? ` on ${verdict.case}` : ""}.` }) : null,
    requirement.reason ? el("p", { class: "requirement-reason", text: sentence(requirement.reason) }) : null,
    requirement.cases ? el("p", { text: `Judged on ${requirement.cases.join(", ")} only.` }) : null,
    everyCase(store, requirement, unit, shown),
  ];
  told.replaceChildren(...lines.filter(Boolean));
}

function rowButtons(store, requirement, index, actions) {
  const name = measureFacts(store.measures, requirement.measure).label;
  const count = store.design.requirements.length;
  const act = (word, run, key, disabled = false) => textButton(word, run, { "aria-label": `${word} ${name}`, data: { act: key }, disabled });
  return el("div", { class: "requirement-actions" },
    act("edit", () => actions.edit(index), "edit"),
    act("move up", () => actions.move(index, index - 1), "up", index === 0),
    act("move down", () => actions.move(index, index + 1), "down", index === count - 1),
    act("remove", () => actions.remove(index), "remove"));
}

function everyCase(store, requirement, unit, shown) {
  const cases = store.lastGood?.assessment.cases ?? [];
  if (cases.length < 2 || !cases.some((one) => one.readings[requirement.measure])) return null;
  return el("dl", { class: "requirement-cases" }, ...cases.flatMap((one) => [
    el("dt", { text: one.name }),
    el("dd", { text: readingText(one.readings[requirement.measure], unit, shown) }),
  ]));
}

/** As a sentence of its own: capital at the front, full stop at the end. */
export function sentence(text) {
  const clean = text.trim();
  const end = /[.!?:;]$/.test(clean) ? "" : ".";
  return clean.charAt(0).toUpperCase() + clean.slice(1) + end;
}
