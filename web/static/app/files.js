import { el, textButton } from "./element.js";
import { fileStem, keepFile } from "./keep_file.js";
import { askWithText } from "./request.js";
import { sheet } from "./sheet.js";

/** Larger files are not read into the page at all. */
const LARGEST_FILE = 20_000_000;

/**
 * Open a design: chosen, dropped anywhere on the page, or pasted. What cannot be used is said with the field
 * it names, and the present work stays.
 *
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 * @returns {() => void} opens the dialog
 */
export function openFile(root, store) {
  const window_ = sheet(root, { title: "open a design", class: "open-sheet keeps-open" });
  const picker = el("input", { type: "file", accept: ".json,application/json", class: "visually-hidden", tabindex: "-1", "aria-hidden": "true",
    on: { change: () => picker.files[0] && takeFile(picker.files[0]) } });
  const choose = el("button", { type: "button", class: "strong", text: "choose a file", on: { click: () => picker.click() } });
  const pasted = el("textarea", { class: "field mono", rows: "6", spellcheck: "false", "aria-label": "a design as text", placeholder: '{"format": "loopwright-design/1", …}' });
  const faults = el("div", { class: "file-faults", role: "alert" });
  window_.body.append(
    el("p", { text: "A design file (loopwright-design/1, JSON). It can also be dropped anywhere on the page. Your present work can be brought back with undo." }),
    el("div", { class: "row" }, choose, picker, textButton("look at the demos", (event) => {
      window_.close();
      event.target.dispatchEvent(new CustomEvent("call-up", { bubbles: true, detail: { dialog: "demos" } }));
    })),
    el("label", { class: "label-text", text: "or paste it here" }), pasted,
    el("button", { type: "button", class: "outlined", text: "open what was pasted", on: { click: () => takeText(pasted.value, "The pasted text") } }),
    faults,
  );

  function open() {
    faults.replaceChildren();
    pasted.value = "";
    window_.open();
    choose.focus();
  }

  async function takeFile(file) {
    picker.value = "";
    if (file.size > LARGEST_FILE) return complain(file.name, [{ where: "", what: `has ${Math.round(file.size / 1e6)} MB, which is more than a design; choose another` }]);
    return takeText(await file.text(), file.name);
  }

  async function takeText(text, name) {
    faults.replaceChildren();
    const answer = await askWithText("POST", "/api/assessment", text);
    if (!answer.ok) return complain(name, answer.errors);
    const design = JSON.parse(text.replace(/^\uFEFF/, ""));
    if (window_.dialog.open) window_.close();
    store.load(design, { origin: { kind: "file", name } });
    store.say(`${design.title || name} is open; undo brings back what was here`);
  }

  function complain(name, errors) {
    if (!window_.dialog.open) open();
    const one = errors.length === 1 ? "" : `${errors.length} things are wrong in it`;
    faults.replaceChildren(
      el("p", { class: "fault", text: `${name} was not opened; your work is as it was.${one ? ` ${one}:` : ""}` }),
      el("ul", {}, ...errors.map(({ where, what }) => el("li", {}, where ? el("code", { text: where }) : null, where ? `: ${what}` : `the file ${what}`))));
    faults.scrollIntoView({ block: "nearest" });
  }

  dropAnywhere(root, takeFile);
  document.addEventListener("paste", (event) => {
    if (event.target.closest?.("input, textarea, dialog")) return;
    const text = event.clipboardData?.getData("text/plain") ?? "";
    if (!text.includes("loopwright-design/")) return;
    event.preventDefault();
    takeText(text, "The pasted text");
  });
  document.addEventListener("keydown", (event) => {
    if (!(event.ctrlKey || event.metaKey) || event.altKey || event.shiftKey) return;
    const act = { o: open, s: () => saveFile(store) }[event.key.toLowerCase()];
    if (!act) return;
    event.preventDefault();
    act();
  });
  return open;
}

/** @param {import("./store.js").Store} store */
export function saveFile(store) {
  if (!store.design) return;
  const name = `${fileStem(store.design.title)}.loopwright.json`;
  keepFile(name, `${JSON.stringify(store.design, null, 2)}\n`, "application/json");
  store.say(`saved as ${name}`);
}

function dropAnywhere(root, take) {
  const veil = el("div", { class: "drop-veil", hidden: true }, el("p", { text: "let go to open the design" }));
  root.append(veil);
  let depth = 0;
  const carriesFile = (event) => event.dataTransfer?.types.includes("Files");
  document.addEventListener("dragenter", (event) => {
    if (!carriesFile(event)) return;
    depth += 1;
    veil.hidden = false;
  });
  document.addEventListener("dragleave", (event) => {
    if (!carriesFile(event)) return;
    depth -= 1;
    veil.hidden = depth > 0 ? veil.hidden : true;
  });
  document.addEventListener("dragover", (event) => carriesFile(event) && event.preventDefault());
  document.addEventListener("drop", (event) => {
    if (!carriesFile(event)) return;
    event.preventDefault();
    depth = 0;
    veil.hidden = true;
    if (event.dataTransfer.files[0]) take(event.dataTransfer.files[0]);
  });
}
