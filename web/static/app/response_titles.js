/** Titles of the response plots, with their units and what they answer to. */

import { el, setText, textButton } from "./element.js";
import { joinUnit, tick } from "./format.js";
import { set } from "./svg.js";

// From the edge of the column: a narrow plot has no room for title, unit and scenario in one line.
const TITLE_LEFT = 16;

/** @param {HTMLElement} stage @param {import("./store.js").Store} store */
export function responseTitles(stage, store) {
  const command = commandTitle(store);
  const load = plainTitle("load disturbance");
  const effort = plainTitle("actuator effort");
  const titles = [command, load, effort];
  stage.append(...titles.map((title) => title.node));
  return {
    /** @param {import("./geometry.js").ResponseGeometry} geometry */
    draw(geometry) {
      const { signals, scenario, actuator } = store.design ?? {};
      command.update(signals, scenario);
      load.update(unitOf(signals?.output), loadWords(signals, scenario));
      effort.update(unitOf(signals?.effort), actuatorWords(actuator));
      for (const [index, title] of titles.entries()) {
        title.node.style.transform = `translate(${TITLE_LEFT}px, ${geometry.plots[index].top - 22}px)`;
        title.node.style.width = `${geometry.right - TITLE_LEFT}px`;
      }
    },
  };
}

function plainTitle(/** @type {string} */ name) {
  const unit = el("span", { class: "plot-unit" });
  const more = el("span", { class: "plot-more" });
  const node = el("div", { class: "response-title" }, el("span", { class: "plot-name", text: name }), unit, more);
  return {
    node, unit, more,
    update(/** @type {string} */ unitText, /** @type {string} */ moreText) {
      setText(unit, unitText);
      setText(more, moreText);
    },
  };
}

function commandTitle(/** @type {import("./store.js").Store} */ store) {
  const title = plainTitle("command response");
  const shapes = ["step", "ramp"].map((shape) => textButton(shape, () => setShape(store, shape), { class: "shape-word", "aria-label": `command: ${shape}` }));
  title.more.append(el("span", { class: "shape-words", role: "group", "aria-label": "shape of the command" }, shapes[0], " · ", shapes[1]));
  return {
    node: title.node,
    update(/** @type {any} */ signals, /** @type {any} */ scenario) {
      const shape = scenario?.command?.shape ?? "step";
      setText(title.unit, unitOf(signals?.output));
      for (const button of shapes) set(button, { "aria-pressed": button.textContent === shape });
    },
  };
}

function setShape(/** @type {import("./store.js").Store} */ store, /** @type {string} */ shape) {
  store.edit(`command by a ${shape}`, (design) => {
    if ((design.scenario?.command?.shape ?? "step") === shape) return design;
    return { ...design, scenario: { ...design.scenario, command: { ...design.scenario?.command, shape } } };
  });
}

/** A pure number has no unit to show. @param {{unit?: string} | undefined} signal */
function unitOf(signal) {
  return signal?.unit && signal.unit !== "1" ? signal.unit : "";
}

// The load enters where the effort does, so it is counted in the effort's unit.
function loadWords(/** @type {any} */ signals, /** @type {any} */ scenario) {
  return `step of ${joinUnit(tick(scenario?.load?.amplitude ?? 1), unitOf(signals?.effort))}`;
}

function actuatorWords(/** @type {any} */ actuator) {
  const limits = [actuator?.low, actuator?.high].filter((limit) => typeof limit === "number").map(tick);
  return limits.length ? `${limits.length > 1 ? "limits" : "limit"} ${limits.join(" and ")}` : "";
}
