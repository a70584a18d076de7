/** SVG elements without markup strings, and attribute writes that skip what has not changed. */

const SPACE = "http://www.w3.org/2000/svg";

/** @param {string} tag @param {Record<string, any>} [attributes] `text` sets the content @param {...Node} children
 *  @returns {SVGElement} */
export function svg(tag, attributes = {}, ...children) {
  const node = document.createElementNS(SPACE, tag);
  set(node, attributes);
  node.append(...children);
  return node;
}

/** null takes an attribute away. @param {Element} node @param {Record<string, any>} attributes */
export function set(node, attributes) {
  for (const [name, value] of Object.entries(attributes)) {
    if (name === "text") {
      if (node.textContent !== value) node.textContent = value;
    } else if (value === null) node.removeAttribute(name);
    else if (node.getAttribute(name) !== String(value)) node.setAttribute(name, String(value));
  }
}

/** @param {Element} node @param {boolean} shown */
export function show(node, shown) {
  /** @type {any} */ (node).style.display = shown ? "" : "none";
}

let family = "";
const measuring = /** @type {CanvasRenderingContext2D} */ (document.createElement("canvas").getContext("2d"));
const widths = /** @type {Map<string, number>} */ (new Map());

/** Width of a text in px, without touching the layout of the page. @param {string} text @param {number} size
 *  @param {number} [weight] */
export function textWidth(text, size, weight = 400) {
  const key = `${weight}|${size}|${text}`;
  const known = widths.get(key);
  if (known !== undefined) return known;
  family ||= getComputedStyle(document.documentElement).getPropertyValue("--font");
  measuring.font = `${weight} ${size}px ${family}`;
  const width = measuring.measureText(text).width;
  if (widths.size > 2000) widths.clear();
  widths.set(key, width);
  return width;
}
