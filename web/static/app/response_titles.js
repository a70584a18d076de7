/** Titles of the response plots, with the scenario in words: "to a step of 0.2 rad", each word a control. */

import { withField } from "./design_edits.js";
import { el, setText, textButton } from "./element.js";
import { exactNumber } from "./exact_number.js";
import { number } from "./format.js";

/** @param {HTMLElement} stage @param {import("./store.js").Store} store */
export function responseTitles(stage, store) {
  const command = commandTitle(store);
  const load = loadTitle(store);
  const effort = plainTitle("actuator effort");
  const titles = [command, load, effort];
  stage.append(...titles.map((title) => title.node));
  return {
    /** @param {import("./geometry.js").ResponseGeometry} geometry */
    draw(geometry) {
      const { signals, scenario, actuator } = store.design ?? {};
      command.update(signals, scenario);
      load.update(signals, scenario);
      effort.update(signals?.effort?.unit, actuatorWords(actuator));
      for (const [index, title] of titles.entries()) {
        title.node.style.transform = `translate(${geometry.left}px, ${geometry.plots[index].top - 22}px)`;
        title.node.style.width = `${geometry.right - geometry.left}px`;
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
    update(/** @type {string | undefined} */ unitText, /** @type {string} */ moreText) {
      setText(unit, unitText ?? "");
      setText(more, moreText);
    },
  };
}

function commandTitle(/** @type {import("./store.js").Store} */ store) {
  const title = plainTitle("command response");
  const shapes = ["step", "ramp"].map((shape) => textButton(shape, () => setShape(store, shape), { class: "shape-word", "aria-label": `command: ${shape}` }));
  const amplitude = exactNumber({
    name: "size of the command", show: (value) => number(value ?? 1), keep: async (value) => changeScenario(store, "command", "amplitude", value),
  });
  const unit = el("span");
  title.more.append(el("span", { class: "shape-words", role: "group", "aria-label": "shape of the command" }, ...shapes), " of ", amplitude.node, " ", unit);
  return {
    node: title.node,
    update(/** @type {any} */ signals, /** @type {any} */ scenario) {
      const shape = scenario?.command?.shape ?? "step";
      const base = signals?.output?.unit ?? "";
      setText(title.unit, base);
      setText(unit, shape === "ramp" ? `${signals?.command?.unit || base || "1"}/s` : signals?.command?.unit || base);
      amplitude.update(scenario?.command?.amplitude ?? 1);
      for (const button of shapes) button.setAttribute("aria-pressed", String(button.textContent === shape));
    },
  };
}

function loadTitle(/** @type {import("./store.js").Store} */ store) {
  const title = plainTitle("load disturbance");
  const amplitude = exactNumber({
    name: "size of the load step", show: (value) => number(value ?? 1), keep: async (value) => changeScenario(store, "load", "amplitude", value),
  });
  const unit = el("span");
  title.more.append("step of ", amplitude.node, " ", unit);
  return {
    node: title.node,
    update(/** @type {any} */ signals, /** @type {any} */ scenario) {
      setText(title.unit, signals?.output?.unit ?? "");
      // The load enters where the effort does, so it is counted in the effort's unit.
      setText(unit, signals?.effort?.unit ?? "");
      amplitude.update(scenario?.load?.amplitude ?? 1);
    },
  };
}

function setShape(/** @type {import("./store.js").Store} */ store, /** @type {string} */ shape) {
  if ((store.design?.scenario?.command?.shape ?? "step") !== shape) changeScenario(store, "command", "shape", shape);
}

/** @returns {string | null} what is wrong with the value */
function changeScenario(/** @type {import("./store.js").Store} */ store, /** @type {"command" | "load"} */ part, /** @type {string} */ field, /** @type {any} */ value) {
  if (value === 0) return "must not be 0: there would be nothing to see";
  store.edit(`change the ${part}`, (design) => {
    const scenario = design.scenario ?? {};
    return { ...design, scenario: { ...scenario, [part]: withField(scenario[part] ?? {}, field, value) } };
  });
  return null;
}

function actuatorWords(/** @type {any} */ actuator) {
  const { low, high } = actuator ?? {};
  if (typeof low === "number" && typeof high === "number") return `limits ${number(low)} and ${number(high)}`;
  if (typeof high === "number") return `limit ${number(high)}`;
  return typeof low === "number" ? `limit ${number(low)}` : "";
}
