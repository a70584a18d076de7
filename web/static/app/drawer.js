import { casesTab } from "./cases_tab.js";
import { el } from "./element.js";
import { pinnedTab } from "./pinned_tab.js";
import { scenarioTab } from "./scenario_tab.js";
import { stagesTab } from "./stages_tab.js";

/**
 * @typedef {object} Tab
 * @property {(changed: "design"|"frame"|"pinned"|"ui"|"shown"|"catalogue") => void} draw called only while the tab is shown
 */

/** Name on the tab, and what builds it. @type {[string, (root: HTMLElement, store: any) => Tab][]} */
const TABS = [
  ["stages", stagesTab],
  ["plant cases", casesTab],
  ["scenario", scenarioTab],
  ["now and pinned", pinnedTab],
];

/**
 * The drawer under the charts.
 *
 * @param {HTMLElement} root
 * @param {import("./store.js").Store} store
 */
export function drawer(root, store) {
  const parts = TABS.map(([name, build], index) => {
    const id = `drawer-${name.replaceAll(" ", "-")}`;
    const tab = el("button", {
      type: "button", role: "tab", class: "tab", id: `${id}-tab`, "aria-controls": id, text: name,
      on: { click: () => show(index), keydown: (event) => travel(event, index) },
    });
    const panel = el("div", { role: "tabpanel", class: "tab-panel", id, "aria-labelledby": tab.id, hidden: true });
    return { tab, panel, content: build(panel, store) };
  });
  let current = 0;

  function show(index) {
    current = index;
    parts.forEach(({ tab, panel }, i) => {
      tab.setAttribute("aria-selected", String(i === index));
      tab.tabIndex = i === index ? 0 : -1;
      panel.hidden = i !== index;
    });
    parts[index].content.draw("shown");
  }

  function travel(event, index) {
    const last = parts.length - 1;
    const to = { ArrowRight: index === last ? 0 : index + 1, ArrowLeft: index === 0 ? last : index - 1, Home: 0, End: last }[event.key];
    if (to === undefined) return;
    event.preventDefault();
    show(to);
    parts[to].tab.focus();
  }

  root.replaceChildren(
    el("div", { class: "tabs", role: "tablist", "aria-label": "drawer" }, ...parts.map(({ tab }) => tab)),
    ...parts.map(({ panel }) => panel),
  );
  for (const type of ["design", "frame", "pinned", "ui", "catalogue"]) {
    store.addEventListener(type, () => parts[current].content.draw(type));
  }
  show(0);
}
