/** Draws on animation frames: many changes between two frames are one drawing. */

/** @param {() => void} draw @returns {() => void} asks for a drawing on the next animation frame */
export function onNextFrame(draw) {
  let asked = false;
  return () => {
    if (asked) return;
    asked = true;
    requestAnimationFrame(() => {
      asked = false;
      draw();
    });
  };
}
