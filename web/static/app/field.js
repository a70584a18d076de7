import { el, freshId } from "./element.js";
import { placeWords } from "./typed_list.js";

/**
 * A labelled control with a place for what is wrong with it.
 *
 * @typedef {{node: HTMLElement, control: HTMLElement, setFault: (what: string|null) => void, fault: () => string|null}} Field
 */

/**
 * @param {string} label
 * @param {HTMLElement} control input, select, textarea or a group with role
 * @param {{hint?: string, class?: string, group?: boolean}} [options] `group` labels a set of controls instead of one
 * @returns {Field}
 */
export function field(label, control, { hint = "", class: extra = "", group = false } = {}) {
  const id = control.id || (control.id = freshId("field"));
  const fault = el("p", { class: "fault", id: `${id}-fault`, role: "alert" });
  const hintNode = hint ? el("p", { class: "hint", id: `${id}-hint`, text: hint }) : null;
  const described = [hintNode?.id, fault.id].filter(Boolean).join(" ");
  control.setAttribute("aria-describedby", described);
  const name = el(group ? "span" : "label", { class: "label-text", text: label, id: `${id}-name`, for: group ? null : id });
  if (group) control.setAttribute("aria-labelledby", name.id);
  const node = el("div", { class: `labelled ${extra}`.trim() }, name, control, fault, hintNode);
  return {
    node,
    control,
    fault: () => fault.textContent || null,
    setFault(what) {
      fault.textContent = what ?? "";
      node.classList.toggle("has-fault", Boolean(what));
      if (group) return;
      if (what) control.setAttribute("aria-invalid", "true");
      else control.removeAttribute("aria-invalid");
    },
  };
}

/** A one-line text input. */
export function textInput(value = "", properties = {}) {
  return el("input", { type: "text", class: "field", autocomplete: "off", spellcheck: "false", value, ...properties });
}

/** A choice among few; `options` are [value, text] pairs. */
export function choice(options, value, properties = {}) {
  const node = el("select", { class: "field", ...properties }, ...options.map(([v, text]) => el("option", { value: v, text })));
  node.value = value;
  return node;
}

/**
 * Put each fault beside the field that it names. A fault whose path no field has goes to the closest
 * enclosing field, and else to `rest`.
 *
 * @param {Map<string, Field>} fields by path relative to `prefix`
 * @param {import("./request.js").Fault[]} faults
 * @param {string} prefix path of the part being edited, as `requirements[2]`
 * @param {HTMLElement} rest where everything else is said
 */
export function placeFaults(fields, faults, prefix, rest) {
  for (const one of fields.values()) one.setFault(null);
  const homeless = [];
  for (const { where, what } of faults) {
    const inside = where.startsWith(prefix) ? where.slice(prefix.length).replace(/^\./, "") : null;
    const home = inside === null ? undefined : closest(fields, inside);
    if (!home) homeless.push(where ? `${where}: ${what}` : what);
    else if (!home.field.fault()) home.field.setFault(home.rest ? `${placeWords(home.rest)}: ${what}` : what);
  }
  rest.textContent = homeless.join("\n");
  const first = [...fields.values()].find((one) => one.fault());
  first?.control.focus?.();
}

function closest(fields, path) {
  let best;
  for (const [where, one] of fields) {
    const matches = path === where || path.startsWith(`${where}.`) || path.startsWith(`${where}[`);
    if (matches && (!best || where.length > best.where.length)) best = { where, field: one, rest: path.slice(where.length) };
  }
  return best;
}
