/**
 * Places small labels beside what they name so that they do not cover one another, a marker or the curve.
 *
 * @typedef {{x: number, y: number, width: number, height: number}} Box
 * @typedef {{id: string, x: number, y: number, width: number, height: number, within: Box, gap?: number}} Wanted
 */

const remembered = /** @type {Map<string, number>} */ (new Map());

/** @param {Wanted[]} wanted most important first @param {Box[]} obstacles @returns {Map<string, Box>} */
export function placeLabels(wanted, obstacles) {
  const placed = /** @type {Map<string, Box>} */ (new Map());
  const taken = [...obstacles];
  for (const label of wanted) {
    const places = candidates(label);
    // Where it stood a moment ago is worth a little overlap: labels that hop cannot be read.
    const before = remembered.get(label.id) ?? -1;
    let best = 0;
    let least = Infinity;
    for (const [index, box] of places.entries()) {
      const cost = overlapOf(box, taken) + 20 * outside(box, label.within) + index * 6 - (index === before ? 120 : 0);
      if (cost < least) {
        least = cost;
        best = index;
      }
    }
    remembered.set(label.id, best);
    const box = pushedInside(places[best], label.within);
    placed.set(label.id, box);
    taken.push(box);
  }
  return placed;
}

/** @returns {Box[]} */
function candidates(/** @type {Wanted} */ { x, y, width, height, gap = 10 }) {
  const boxes = [];
  for (const far of [gap, gap + 20, gap + 48, gap + 84]) {
    for (const lift of [0, -26, 26]) {
      boxes.push({ x: x + far, y: y - height / 2 + lift, width, height });
      boxes.push({ x: x - far - width, y: y - height / 2 + lift, width, height });
    }
    boxes.push({ x: x - width / 2, y: y + far, width, height });
    boxes.push({ x: x - width / 2, y: y - far - height, width, height });
  }
  return boxes;
}

function overlapOf(/** @type {Box} */ box, /** @type {Box[]} */ others) {
  let area = 0;
  for (const other of others) {
    const wide = Math.min(box.x + box.width, other.x + other.width) - Math.max(box.x, other.x);
    const high = Math.min(box.y + box.height, other.y + other.height) - Math.max(box.y, other.y);
    if (wide > 0 && high > 0) area += wide * high;
  }
  return area;
}

function outside(/** @type {Box} */ box, /** @type {Box} */ within) {
  return Math.max(0, within.x - box.x) + Math.max(0, box.x + box.width - within.x - within.width)
    + Math.max(0, within.y - box.y) + Math.max(0, box.y + box.height - within.y - within.height);
}

/** @param {Box} box @param {Box} within @returns {Box} */
export function pushedInside(box, within) {
  return {
    ...box,
    x: Math.max(within.x, Math.min(box.x, within.x + within.width - box.width)),
    y: Math.max(within.y, Math.min(box.y, within.y + within.height - box.height)),
  };
}

/** Small boxes along a curve, so that labels keep off it. @param {(x: number) => number} y px at px
 *  @param {number} from @param {number} to @param {number} [every] @returns {Box[]} */
export function boxesAlong(y, from, to, every = 8) {
  const boxes = [];
  for (let x = from; x <= to; x += every) {
    const at = y(x);
    if (Number.isFinite(at)) boxes.push({ x: x - every / 2, y: at - 3, width: every, height: 6 });
  }
  return boxes;
}
