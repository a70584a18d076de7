/**
 * Where everything on the loop chart stands, in px of the stage: gain above, phase below it, then the rail
 * with one lane a stage, then the frequencies. Plotly's layout and our own layers both follow from this.
 *
 * @typedef {{top: number, bottom: number}} Span
 * @typedef {{width: number, height: number, left: number, right: number, gain: Span, phase: Span,
 *            lanes: (Span & {middle: number})[], railTop: number, railBottom: number, ticksAt: number,
 *            figureHeight: number}} Geometry
 */

const LEFT = 92;
const RIGHT = 24;
const TOP = 34;
const BETWEEN = 32;
const ABOVE_RAIL = 14;
const TICKS = 28;
const LANE_GAP = 4;
const LEAST_PLOTS = 260;
const GAIN_SHARE = 0.585;

/** @param {number} width @param {number} height what the page offers @param {number} laneCount @returns {Geometry} */
export function chartGeometry(width, height, laneCount) {
  const tight = height < 560;
  const pitch = laneCount > 5 || (tight && laneCount > 3) ? 28 : laneCount > 3 || tight ? 32 : 36;
  const rail = laneCount * pitch;
  const plots = Math.max(LEAST_PLOTS, height - TOP - BETWEEN - ABOVE_RAIL - rail - TICKS);
  const gain = { top: TOP, bottom: Math.round(TOP + plots * GAIN_SHARE) };
  const phase = { top: gain.bottom + BETWEEN, bottom: TOP + BETWEEN + Math.round(plots) };
  const railTop = phase.bottom + ABOVE_RAIL;
  const lanes = Array.from({ length: laneCount }, (_, index) => {
    const top = railTop + index * pitch;
    const bottom = top + pitch - LANE_GAP;
    return { top, bottom, middle: (top + bottom) / 2 };
  });
  const railBottom = railTop + rail - LANE_GAP;
  return {
    width, height: railBottom + TICKS, left: LEFT, right: width - RIGHT, gain, phase,
    lanes, railTop, railBottom, ticksAt: railBottom + 18, figureHeight: phase.bottom + 4,
  };
}

/** @typedef {{width: number, height: number, left: number, right: number, plots: Span[]}} ResponseGeometry */

/** Three plots below one another, each with its own time ticks. @param {number} width @param {number} height
 *  @returns {ResponseGeometry} */
export function responseGeometry(width, height) {
  const titled = 26;
  const ticks = 26;
  const each = Math.max(150, (height - 4) / 3);
  const plots = [0, 1, 2].map((index) => ({
    top: Math.round(index * each + titled),
    bottom: Math.round((index + 1) * each - ticks),
  }));
  return { width, height: Math.round(each * 3 + 4), left: 54, right: width - 18, plots };
}
