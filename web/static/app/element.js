/**
 * Build DOM elements without markup strings.
 *
 * @param {string} tag
 * @param {Object<string, *>} [properties] `class`, `text`, `data` (dataset), `on` (listeners by event name);
 *   true and false set or leave out an attribute, null leaves it out, everything else is an attribute.
 * @param {...(Node|string|null|undefined|false)} children
 * @returns {HTMLElement}
 */
export function el(tag, properties = {}, ...children) {
  const node = document.createElement(tag);
  for (const [name, value] of Object.entries(properties)) setProperty(node, name, value);
  node.append(...children.flat().filter((child) => child !== null && child !== undefined && child !== false));
  return node;
}

function setProperty(node, name, value) {
  if (value === null || value === undefined || value === false) return;
  if (name === "class") node.className = value;
  else if (name === "text") node.textContent = value;
  else if (name === "value") node.value = value;
  else if (name === "data") Object.assign(node.dataset, value);
  else if (name === "on") for (const [event, listener] of Object.entries(value)) node.addEventListener(event, listener);
  else node.setAttribute(name, value === true ? "" : String(value));
}

/**
 * A button that reads as text in a line.
 *
 * @param {string} text what it shows
 * @param {(event: Event) => void} act
 * @param {Object<string, *>} [properties] as for `el`; `aria-label` when the text alone does not say what it acts on
 */
export function textButton(text, act, properties = {}) {
  const { class: extra = "", ...rest } = properties;
  return el("button", { type: "button", class: `text-button ${extra}`.trim(), text, on: { click: act }, ...rest });
}

/** Set text only where it differs, so that an unchanged row costs nothing and a selection in it survives. */
export function setText(node, text) {
  if (node.textContent !== text) node.textContent = text;
}

let lastId = 0;

/** An id that is unique on the page, for labels and descriptions. */
export function freshId(stem) {
  lastId += 1;
  return `${stem}-${lastId}`;
}
