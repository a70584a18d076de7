import { cautions } from "./cautions.js";
import { el, textButton } from "./element.js";
import { copyText, fileStem, keepFile } from "./keep_file.js";
import { ask } from "./request.js";
import { sentence } from "./requirement_row.js";
import { sharedLinks } from "./shared_links.js";
import { sheet } from "./sheet.js";

const FORMS = [
  { kind: "transfer-function", label: "transfer function, JSON", ending: "json", type: "application/json" },
  { kind: "curves", label: "curves, CSV", ending: "csv", type: "text/csv" },
];
/** Enough to see what the file is like; the whole of it is copied and downloaded. */
const PREVIEW_LINES = 400;

/**
 * Hand the compensator over: the verdict said plainly, the cautions, then the file.
 *
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 * @returns {() => void} opens the dialog
 */
export function handOver(root, store) {
  const window_ = sheet(root, { title: "hand over", class: "hand-over-sheet" });
  const verdict = el("section", { class: "hand-over-verdict", "aria-live": "polite" });
  const forms = el("div", { class: "segments", role: "radiogroup", "aria-label": "what to hand over" }, ...FORMS.map((form) =>
    el("label", { class: "segment" }, el("input", { type: "radio", name: "hand-over-form", value: form.kind, on: { change: () => show(form) } }), el("span", { text: form.label }))));
  const preview = el("pre", { class: "preview mono", tabindex: "0", role: "region", "aria-label": "preview of the file" });
  const fault = el("p", { class: "fault", role: "alert" });
  const download = el("button", { type: "button", class: "strong", on: { click: () => keepFile(`${fileStem(design.title)}-${form.kind}.${form.ending}`, text, form.type) } });
  const copy = el("button", { type: "button", class: "outlined", text: "copy", on: { click: () => copyText(text, copy) } });
  window_.body.append(el("div", { class: "hand-over" }, el("div", {}, verdict, cautions()), el("div", { class: "hand-over-file" }, forms, fault, preview)));
  window_.foot.append(download, copy, textButton("close", () => window_.close(), { class: "quiet" }));
  let design = null;
  let form = FORMS[0];
  let text = "";
  let ticket = 0;

  async function show(wanted) {
    form = wanted;
    ticket += 1;
    const mine = ticket;
    for (const input of forms.querySelectorAll("input")) input.checked = input.value === form.kind;
    const answer = await ask("POST", address(store, form), design);
    if (mine !== ticket) return;
    text = answer.ok ? answer.text : "";
    download.disabled = copy.disabled = !answer.ok;
    fault.textContent = answer.ok ? "" : answer.errors.map(({ where, what }) => (where ? `${where}: ${what}` : what)).join("\n");
    preview.textContent = previewOf(text);
    if (answer.ok && form.kind === "transfer-function") drawVerdict(answer.body);
  }

  function drawVerdict(file) {
    const met = file.verdict === "met";
    verdict.dataset.verdict = file.verdict;
    verdict.replaceChildren(
      el("p", { class: "verdict", text: sentence(file.headline) }),
      ...(file.warnings.length > 0 ? [el("ul", { class: "warnings" }, ...file.warnings.map((warning) => el("li", { text: warning })))] : []),
      ...(file.compensator.realisable ? [] : [el("p", { class: "fault", text: "More zeros than poles: it cannot be built as it stands. Add a pole that rolls it off." })]),
      ...(met ? [] : [el("p", { class: "hint", text: "It can be handed over all the same; the file says this in its first lines." })]));
    download.textContent = met ? "download" : `download, marked “${file.verdict}”`;
  }

  return async () => {
    if (!store.design) return;
    design = store.design;
    verdict.replaceChildren(el("p", { class: "hint", text: "Judging the design…" }));
    verdict.dataset.verdict = "";
    preview.textContent = "";
    download.textContent = "download";
    download.disabled = copy.disabled = true;
    window_.open();
    await show(FORMS[0]);
  };
}

/** Where exactly this design was shared from here, the file carries the link for tracing back. */
function address(store, form) {
  const sha = store.frame?.ok && !store.waiting ? store.frame.design_sha256 : null;
  const token = sha && sharedLinks().find((one) => one.design_sha256 === sha)?.token;
  return `/api/exports/${form.kind}${token ? `?token=${encodeURIComponent(token)}` : ""}`;
}

function previewOf(text) {
  const lines = text.split(/\r?\n/);
  if (lines.length <= PREVIEW_LINES) return text;
  return `${lines.slice(0, PREVIEW_LINES).join("\n")}\n… ${lines.length - PREVIEW_LINES} more lines`;
}
