import { el } from "./element.js";
import { field, textInput } from "./field.js";
import { exact } from "./format.js";
import { numberFault, typedNumber } from "./typed_number.js";
import { rootsText, typedMatrix, typedNumbers, typedRoots } from "./typed_list.js";

/**
 * The forms in which a model can be typed. Each builds its fields once and then moves between text and model.
 *
 * @typedef {object} Draft
 * @property {[string, import("./field.js").Field][]} fields by path in the model
 * @property {() => boolean} isEmpty nothing typed yet
 * @property {(model: object|null) => void} set show a model, or nothing
 * @property {() => {model: object, faults: [string, string][]}} read
 * @property {(parsed: {gain: number, zeros: any[], poles: any[], text: string}) => void} [fill] from what another form was read as
 * @property {(errors: import("./request.js").Fault[]|null) => void} [point] show the column of a fault
 */

function area(rows, placeholder, extra = {}) {
  return el("textarea", { class: "field mono", rows, placeholder, autocomplete: "off", spellcheck: "false", wrap: "soft", ...extra });
}

const mono = (placeholder) => textInput("", { class: "field mono", placeholder });
const matrixText = (rows) => rows.map((row) => row.map(exact).join("  ")).join("\n");

/** Fields whose text is read one by one. `kinds`: path, label, control, text → typed value, value → text. */
function draftOf(kind, parts, more = {}) {
  const fields = parts.map(({ path, label, control, hint }) => [path, field(label, control, { hint })]);
  return {
    fields,
    isEmpty: () => parts.every(({ control, path }) => path === "gain" || control.value.trim() === ""),
    set(model) {
      for (const { path, control, write, start = "" } of parts) control.value = model ? write(model[path]) : start;
    },
    read() {
      const model = { kind };
      const faults = [];
      for (const { path, control, typed } of parts) {
        const answer = typed(control.value);
        if (answer.ok) model[path] = answer.value;
        else faults.push([path, answer.what]);
      }
      return { model, faults };
    },
    ...more,
  };
}

const oneNumber = (text) => {
  const value = typedNumber(text);
  const what = numberFault(text, value);
  return what ? { ok: false, what } : { ok: true, value };
};

const COLUMN = /column (\d+)/;

function expressionDraft() {
  const control = area(3, "3.2*(s+40)/(s*(s^2+2*s+900)) * exp(-0.002*s)", { class: "field mono expression" });
  const caret = el("pre", { class: "caret", "aria-hidden": "true", hidden: true });
  const draft = draftOf("expression", [{
    path: "text", label: "formula in s", control, typed: (text) => ({ ok: true, value: text.trim() }), write: (text) => text ?? "",
    hint: "numbers, s, + − * / ^, parentheses, exp(-θ*s) as a factor",
  }]);
  control.after(caret);
  draft.fill = (parsed) => { control.value = formulaOf(parsed); };
  // Leading blanks are not sent: the columns that come back count from the first character that was.
  draft.point = (errors) => {
    const column = Number(COLUMN.exec(errors?.find(({ where }) => where.endsWith("text"))?.what ?? "")?.[1]);
    caret.hidden = !column;
    if (!column) return;
    const text = control.value.trim();
    const from = Math.max(0, column - 1 - 24);
    const shown = text.slice(from, from + 48).replaceAll("\n", " ");
    caret.textContent = `${from > 0 ? "…" : ""}${shown}\n${" ".repeat(column - 1 - from + (from > 0 ? 1 : 0))}↑`;
  };
  return draft;
}

/** A formula with every digit, so that going over to it changes nothing. */
function formulaOf({ gain, zeros, poles }) {
  const plain = (value) => (value < 0 ? `- ${-value}` : `+ ${value}`);
  const product = (roots) => roots.filter(([, im]) => im >= 0).map(([re, im]) => {
    const factor = re === 0 ? "s" : `(s ${plain(-re)})`;
    return im === 0 ? factor : `(${factor}^2 + ${im}^2)`;
  }).join("*");
  const [top, bottom] = [product(zeros), product(poles)];
  return `${gain}${top ? `*${top}` : ""}${bottom ? `/(${bottom})` : ""}`;
}

function factoredDraft() {
  const gain = mono("1");
  const zeros = area(2, "-40");
  const poles = area(3, "0, -1 ± 30j");
  const hint = "real ones as −40, pairs as −1 ± 30j; a comma or a line between them";
  return draftOf("factored", [
    { path: "gain", label: "gain", control: gain, typed: oneNumber, write: exact, start: "1", hint: "gain · Π(s − zero) / Π(s − pole)" },
    { path: "zeros", label: "zeros", control: zeros, typed: typedRoots, write: (roots) => rootsText(roots ?? []) },
    { path: "poles", label: "poles", control: poles, typed: typedRoots, write: (roots) => rootsText(roots ?? []), hint },
  ], {
    fill(parsed) {
      gain.value = exact(parsed.gain);
      zeros.value = rootsText(parsed.zeros);
      poles.value = rootsText(parsed.poles);
    },
  });
}

function polynomialDraft() {
  const typed = (text) => typedNumbers(text);
  const write = (list) => (list ?? []).map(exact).join("  ");
  return draftOf("polynomial", [
    { path: "numerator", label: "numerator", control: mono("3.2 128"), typed, write },
    { path: "denominator", label: "denominator", control: mono("1 2 900 0"), typed, write, hint: "highest power of s first: 1 2 900 0 is s³ + 2s² + 900s" },
  ]);
}

function stateSpaceDraft() {
  const part = (path, rows, placeholder, hint) => ({
    path, label: path, control: area(rows, placeholder), typed: typedMatrix, write: (matrix) => matrixText(matrix ?? []), hint,
  });
  return draftOf("state_space", [
    part("a", 3, "0  1\n-900  -2"), part("b", 3, "0\n1"), part("c", 1, "900  0"),
    part("d", 1, "0", "a row a line, spaces between the entries; a table can be pasted"),
  ]);
}

/** @type {{kind: string, label: string, build: () => Draft}[]} */
export const MODEL_FORMS = [
  { kind: "expression", label: "formula", build: expressionDraft },
  { kind: "polynomial", label: "coefficients", build: polynomialDraft },
  { kind: "factored", label: "zeros and poles", build: factoredDraft },
  { kind: "state_space", label: "state space", build: stateSpaceDraft },
];
