/** Keeps drawn elements as long as what they stand for is there: a dragged handle must not be built anew. */

/** @template Item, Part
 *  @param {Element} parent @param {(item: Item) => string} keyOf
 *  @param {(item: Item) => Part & {node: Element}} make @param {(part: Part, item: Item) => void} update
 *  @returns {(items: Item[]) => Map<string, Part & {node: Element}>} */
export function keyed(parent, keyOf, make, update) {
  let parts = /** @type {Map<string, Part & {node: Element}>} */ (new Map());
  return (items) => {
    const next = /** @type {typeof parts} */ (new Map());
    for (const item of items) {
      const key = keyOf(item);
      let part = parts.get(key);
      if (!part) {
        part = make(item);
        parent.append(part.node);
      }
      next.set(key, part);
      update(part, item);
    }
    for (const [key, part] of parts) if (!next.has(key)) part.node.remove();
    parts = next;
    return parts;
  };
}
