import { el } from "./element.js";
import { exact, number } from "./format.js";
import { rootWords } from "./typed_list.js";

/** How the server read a model: factored text, then its zeros and poles. */
export function modelReading() {
  const text = el("p", { class: "model-text mono" });
  const roots = el("dl", { class: "model-roots" });
  const said = el("p", { class: "hint", role: "status" });
  const node = el("section", { class: "model-reading", "aria-label": "the model as it is read" }, el("h3", { text: "read as" }), said, text, roots);

  function show(words, stale) {
    said.textContent = words;
    node.classList.toggle("is-stale", stale);
  }

  return {
    node,
    wait() {
      text.textContent = "";
      roots.replaceChildren();
      show("Type a model; its zeros and poles appear here.", false);
    },
    busy: () => node.classList.add("is-busy"),
    fail() {
      node.classList.remove("is-busy");
      show(text.textContent ? "Not readable as it stands; this was the last that was." : "Not readable as it stands.", true);
    },
    /** @param {{text: string, gain: number, zeros: any[], poles: any[], dead_time_s: number}} model */
    show(model) {
      node.classList.remove("is-busy");
      show("", false);
      text.textContent = model.text;
      roots.replaceChildren(
        ...entry("gain", [exact(Number(model.gain.toPrecision(6)))]),
        ...entry("zeros", rootWords(model.zeros), "o"),
        ...entry("poles", rootWords(model.poles), "x"),
        ...(model.dead_time_s > 0 ? entry("dead time", [`${number(model.dead_time_s, 4)} s`]) : []),
      );
    },
  };
}

function entry(name, words, glyph) {
  const values = words.length === 0
    ? [el("span", { class: "hint", text: "none" })]
    : words.map((word) => el("span", { class: "root" }, glyph ? el("span", { class: "glyph", text: glyph, "aria-hidden": "true" }) : null, word));
  return [el("dt", { text: name }), el("dd", {}, ...values)];
}
