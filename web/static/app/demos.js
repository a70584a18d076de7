import { el } from "./element.js";
import { ask } from "./request.js";
import { sheet } from "./sheet.js";

/**
 * The designs that come with the workbench.
 *
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 * @returns {() => void} opens the dialog
 */
export function demos(root, store) {
  const window_ = sheet(root, { title: "demo designs", class: "demos-sheet" });
  const list = el("ul", { class: "demos" });
  const fault = el("p", { class: "fault", role: "alert" });
  window_.body.append(el("p", { class: "hint", text: "Invented plants with realistic requirement sheets. Opening one can be undone." }), list, fault);

  async function take(name) {
    const answer = await ask("GET", `/api/demos/${encodeURIComponent(name)}`);
    if (!answer.ok) {
      fault.textContent = answer.errors[0].what;
      return;
    }
    window_.close();
    const design = answer.body.design ?? answer.body;
    store.load(design, { origin: { kind: "demo", name } });
    store.say(`${design.title} is open; undo brings back what was here`);
  }

  async function draw() {
    fault.textContent = "";
    if (store.demos.length === 0) {
      const answer = await ask("GET", "/api/demos");
      if (!answer.ok) fault.textContent = answer.errors[0].what;
      else store.setCatalogue({ demos: answer.body.demos ?? answer.body });
    }
    list.replaceChildren(...store.demos.map((demo) => el("li", {},
      el("button", { type: "button", class: "demo", on: { click: () => take(demo.name) } },
        el("span", { class: "demo-title", text: demo.title }), el("span", { class: "demo-summary", text: firstSentence(demo.summary ?? "") })))));
  }

  return async () => {
    await draw();
    window_.open();
  };
}

function firstSentence(text) {
  return /^[\s\S]*?[.!?](?=\s|$)/.exec(text)?.[0] ?? text;
}
