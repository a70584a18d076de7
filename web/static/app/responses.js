/** The three responses over time: command, load, actuator effort; same picture language as the loop. */

import { curveOf, valueAt } from "./envelope.js";
import { number } from "./format.js";
import { responseGeometry } from "./geometry.js";
import { markedRow } from "./marked.js";
import { onNextFrame } from "./paint.js";
import { pictureKey, pictureStage } from "./picture_stage.js";
import { readingFlag } from "./reading_flag.js";
import { responseMark } from "./response_mark.js";
import { actuatorLimits, responsePicture, RESPONSES, stableCases } from "./response_picture.js";
import { responseTitles } from "./response_titles.js";
import { linearScale, timeUnit } from "./scales.js";
import { unstableWords } from "./stability_words.js";
import { zoomSurface } from "./surface.js";
import { set, svg } from "./svg.js";
import { fittedResponse, fittedTime, steady, View } from "./view.js";
import { zoomWords } from "./zoom_words.js";

/** @param {HTMLElement} root @param {import("./store.js").Store} store */
export function responses(root, store) {
  const stage = pictureStage(root, store, "Responses over time", () => paint());
  const view = new View();
  const paint = onNextFrame(draw);
  const state = { geometry: responseGeometry(300, 600), values: /** @type {[number, number][]} */ ([]), drawn: "", hover: /** @type {any} */ (null) };
  const scale = () => linearScale(/** @type {[number, number]} */ (view.range ?? [0, 1]), state.geometry.left, state.geometry.right);
  const surface = zoomSurface({
    node: stage.overlay, view, logarithmic: false, changed: paint, scale, plots: () => state.geometry.plots,
    limits: () => [0, wholeTime(store)],
    hover: (place) => {
      state.hover = place;
      paint();
    },
  });
  const titles = responseTitles(stage.node, store);
  const notes = svg("g", { class: "titles" });
  const unstable = svg("text", { class: "unstable" });
  const units = RESPONSES.map(() => svg("text", { class: "tick unit", "text-anchor": "end" }));
  notes.append(unstable, ...units);
  stage.overlay.append(notes);
  const mark = responseMark(stage.overlay, store);
  const reading = readingFlag(stage.overlay);
  const words = zoomWords(view, paint, "times");
  stage.node.append(words.node);

  for (const type of ["design", "frame", "ui", "pinned", "holding", "connection", "theme"]) store.addEventListener(type, paint);
  store.addEventListener("loaded", () => {
    view.forget();
    state.values = [];
  });

  function follow() {
    const { assessment, arrays } = /** @type {any} */ (store.lastGood);
    if (stage.frozen && state.values.length) return;
    const taken = stableCases(assessment);
    const scenario = JSON.stringify(store.design?.scenario);
    const end = fittedTime(arrays.time_s.data, [arrays.command, arrays.load], taken);
    view.fitted = steadyEnd(state.drawn.startsWith(scenario) ? view.fitted : null, end);
    const time = /** @type {[number, number]} */ (view.range);
    const same = `${scenario}${time}` === state.drawn;
    state.drawn = `${scenario}${time}`;
    state.values = RESPONSES.map((name, index) => steady(same ? state.values[index] ?? null : null,
      fittedResponse(arrays.time_s.data, arrays[name], taken, time, name === "effort" ? actuatorLimits(store.design) : [])));
  }

  function draw() {
    if (!store.design || !store.lastGood || !stage.size.width) return;
    state.geometry = responseGeometry(stage.size.width, stage.size.height);
    follow();
    const { geometry, values } = state;
    const picture = responsePicture(store, geometry, { time: /** @type {[number, number]} */ (view.range), values });
    stage.draw(picture, pictureKey(store, picture, markedRow(store)?.caseIndex));
    stage.dress(geometry.width, geometry.height, () => summary(store));
    surface.draw();
    titles.draw(geometry);
    set(unstable, { x: geometry.left + 8, y: geometry.plots[0].bottom - 10, text: unstableWords(store.lastGood.assessment.cases, geometry.right - geometry.left - 16) });
    const unit = timeUnit(/** @type {any} */ (view.range)[1]).text;
    units.forEach((node, index) => set(node, { x: geometry.right, y: geometry.plots[index].bottom + 12, text: unit }));
    mark.draw(picture);
    words.place(2, geometry.plots[2].bottom + 4);
    drawReading(picture);
  }

  function drawReading(/** @type {import("./loop_picture.js").Picture} */ picture) {
    const place = state.hover;
    const index = place ? picture.plots.findIndex((plot) => place.y >= plot.top && place.y <= plot.bottom) : -1;
    if (index < 0 || store.holding) return reading.hide();
    const { time_s, [RESPONSES[index]]: array } = /** @type {any} */ (store.lastGood).arrays;
    const cases = /** @type {any} */ (store.lastGood).assessment.cases;
    const time = scale().value(place.x);
    const line = (/** @type {number} */ at, /** @type {string} */ kind) => ({ kind, text: `${cases[at].name}  ${number(valueAt(time_s.data, curveOf(array, at), time))}` });
    const worst = markedRow(store)?.caseIndex ?? 0;
    const unit = timeUnit(/** @type {any} */ (view.range)[1]);
    const lines = [{ kind: "head", text: `${number(time / unit.seconds)} ${unit.text}` }, line(0, "nominal"), ...(worst > 0 ? [line(worst, "worst")] : [])];
    return reading.draw(place, lines, { left: picture.left, right: picture.right, ...picture.plots[index] });
  }
}

function wholeTime(/** @type {import("./store.js").Store} */ store) {
  const data = /** @type {any} */ (store.lastGood).arrays.time_s.data;
  return data[data.length - 1];
}

/** The end of the time axis moves only when the responses need clearly more or less. */
function steadyEnd(/** @type {[number, number] | null} */ old, /** @type {number} */ end) {
  return /** @type {[number, number]} */ (old && end > old[1] * 0.6 && end < old[1] * 1.15 ? old : [0, end]);
}

function summary(/** @type {import("./store.js").Store} */ store) {
  const [nominal] = /** @type {any} */ (store.lastGood).assessment.cases;
  const said = (/** @type {string} */ measure, /** @type {string} */ unit) => {
    const reading = nominal.readings[measure];
    return reading?.state === "value" ? `${number(reading.value)}${unit}` : reading?.state ?? "unknown";
  };
  return `Responses over time, ${nominal.name}: overshoot ${said("overshoot_pct", " %")}, settling time ${said("settling_time_s", " s")}, peak effort ${said("peak_effort", "")}.`;
}

