import { el, setText } from "./element.js";
import { number, signed } from "./format.js";
import { measureFacts, readingText, unitOf, whereRead } from "./requirement_words.js";
import { rootWords } from "./typed_list.js";
import { sentence } from "./requirement_row.js";
import { toShown } from "./units.js";

/** This table is for reading, not for following a hand. */
const REDRAW_MS = 150;

/**
 * Every reading of every case, now and as pinned, with all crossings and closed-loop poles.
 *
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 * @returns {import("./drawer.js").Tab}
 */
export function pinnedTab(root, store) {
  const lead = el("p", { class: "hint" });
  const head = el("thead");
  const body = el("tbody");
  const table = el("table", { class: "quiet-table readings-table" }, el("caption", { class: "visually-hidden", text: "all readings of all plant cases" }), head, body);
  const why = el("p", { class: "reading-why", role: "status" });
  root.append(lead, el("div", { class: "table-scroll readings-scroll", tabindex: "0", role: "region", "aria-label": "all readings" }, table), why);
  let timer = 0;
  let last = 0;

  body.addEventListener("pointerover", (event) => explain(event.target.closest("[data-why]")));
  body.addEventListener("focusin", (event) => explain(event.target.closest("[data-why]")));

  function explain(cell) {
    setText(why, cell ? cell.dataset.why : "Point at a reading, or move to it, to see where it is read and why.");
  }

  function draw(changed) {
    clearTimeout(timer);
    const wait = changed === "frame" ? Math.max(0, REDRAW_MS - (performance.now() - last)) : 0;
    timer = setTimeout(() => {
      last = performance.now();
      drawNow();
    }, wait);
  }

  function drawNow() {
    const now = store.lastGood?.assessment;
    const pinned = store.pinned?.frame?.assessment ?? null;
    setText(lead, pinned ? "" : "Nothing is pinned. “pin”, at the top, keeps the present design here beside whatever comes next.");
    lead.hidden = Boolean(pinned);
    table.hidden = !now;
    if (!now) return;
    const focused = document.activeElement?.dataset?.cell;
    const cases = now.cases.map((one) => ({ now: one, pinned: pinned?.cases.find((other) => other.name === one.name) ?? null }));
    head.replaceChildren(el("tr", {}, el("th", { scope: "col", text: "reading" }), ...cases.flatMap((one) => [
      el("th", { scope: "col", class: "number", text: pinned ? `${one.now.name}, now` : one.now.name }),
      pinned ? el("th", { scope: "col", class: "number was", text: "pinned" }) : null,
    ])));
    body.replaceChildren(...readingRows(store, cases, Boolean(pinned)), ...listRows(store, cases, Boolean(pinned)));
    if (focused) body.querySelector(`[data-cell="${focused}"]`)?.focus();
    if (!why.textContent) explain(null);
  }

  return { draw };
}

function readingRows(store, cases, pinned) {
  const shown = store.ui.unit;
  const offered = store.measures.map((one) => one.measure);
  const measures = [...offered, ...Object.keys(cases[0].now.readings).filter((name) => !offered.includes(name))]
    .filter((name) => cases.some((one) => one.now.readings[name]));
  let group = null;
  return measures.flatMap((measure) => {
    const facts = measureFacts(store.measures, measure);
    const unit = unitOf(store, measure);
    const cells = cases.flatMap((one, index) => [
      cell(one.now.readings[measure], unit, shown, `${measure}-${index}`, one.now.name, facts.label),
      pinned ? cell(one.pinned?.readings[measure], unit, shown, `${measure}-${index}-was`, `${one.now.name}, pinned`, facts.label, "was") : null,
    ]);
    const row = el("tr", {}, el("th", { scope: "row", text: facts.label }), ...cells);
    if (!facts.group || facts.group === group) return [row];
    group = facts.group;
    return [groupRow(group, cases.length * (pinned ? 2 : 1) + 1), row];
  });
}

const groupRow = (name, columns) => el("tr", { class: "group-row" }, el("th", { scope: "colgroup", colspan: columns, text: name }));

function cell(reading, unit, shown, key, caseName, label, extra = "") {
  const text = readingText(reading, unit, shown);
  const words = [whereRead(reading, shown), reading?.why].filter(Boolean).join("; ");
  const why = `${label}, ${caseName}: ${text}${words ? `. ${sentence(words)}` : "."}`;
  const inside = el("span", { text, tabindex: reading ? "0" : null, data: { cell: key, why }, class: "reading-cell" });
  return el("td", { class: `number ${extra} ${reading && reading.state !== "value" ? "in-words" : ""}`.trim() }, inside);
}

/** What has no single number: every crossing and every closed-loop pole. */
function listRows(store, cases, pinned) {
  const shown = store.ui.unit;
  const at = (rad_s) => (rad_s === null ? "infinity" : number(toShown(rad_s, shown), 4));
  const lists = [
    [`gain crossovers, ${shown} and signed phase margin`, (one) => one.gain_crossovers.map((c) => `${at(c.rad_s)}: ${signed(c.signed_phase_margin_deg, 4)}°`)],
    [`phase crossovers, ${shown} and loop gain`, (one) => one.phase_crossovers.map((c) => `${at(c.rad_s)}: ${c.gain_db === null ? "unbounded" : `${signed(c.gain_db, 4)} dB`}`)],
    ["closed-loop poles, rad/s", (one) => (one.closed_loop_poles === null ? ["endless, with dead time"] : rootWords(one.closed_loop_poles))],
    ["closed loop", (one) => [one.stability], "in-sentences"],
  ];
  const entries = (one, list, look) => (one ? (list(one).length === 0 ? ["none"] : list(one)) : ["–"]).map((word) => el("div", { class: look, text: word }));
  return [groupRow("crossings and poles", cases.length * (pinned ? 2 : 1) + 1), ...lists.map(([name, list, look = null]) =>
    el("tr", { class: "list-row" }, el("th", { scope: "row", text: name }), ...cases.flatMap((one) => [
      el("td", { class: "number" }, ...entries(one.now, list, look)),
      pinned ? el("td", { class: "number was" }, ...entries(one.pinned, list, look)) : null,
    ])))];
}
