import { ask } from "./request.js";

/** Models that were asked for before; a design shows the same few again and again. @type {Map<string, Promise<string>>} */
const asked = new Map();
const MOST_KEPT = 200;

/**
 * A model as one line: a formula as it was typed, everything else as the server writes it in factors.
 *
 * @param {object} model
 * @returns {Promise<string>}
 */
export function modelText(model) {
  if (model.kind === "expression") {
    return Promise.resolve(model.dead_time_s ? `(${model.text})*exp(-${model.dead_time_s}*s)` : model.text);
  }
  const key = JSON.stringify(model);
  if (!asked.has(key)) {
    if (asked.size >= MOST_KEPT) asked.clear();
    asked.set(key, ask("POST", "/api/models", { model }).then((answer) => {
      if (!answer.ok) asked.delete(key);
      return answer.ok ? answer.body.text : "";
    }));
  }
  return asked.get(key);
}
