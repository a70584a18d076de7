/** The crossover grip: slides along the 0 dB line, and the gain follows. There while the nominal crosses once. */

import { crossoverGrasp } from "./grasps.js";
import { handle } from "./handle.js";
import { set, show, svg } from "./svg.js";

/** @param {SVGElement} parent @param {import("./scene.js").Scene} scene @param {import("./handle.js").Hand} hand */
export function crossoverGrip(parent, scene, hand) {
  const place = { x: 0, y: 0 };
  const crossings = () => scene.frame.assessment.cases[0].gain_crossovers;
  const wanted = () => scene.store.aim?.crossover_rad_s ?? crossings()[0]?.rad_s ?? 1;
  const grasp = crossoverGrasp(scene, wanted, () => place);
  const { node, speak } = handle(hand, grasp, { class: "crossover-grip" },
    svg("circle", { class: "glow", r: 14 }),
    svg("circle", { class: "grip-disc", r: 10 }),
    svg("path", { class: "grip-arrows", d: "M-2.5 -3.5L-6 0L-2.5 3.5M2.5 -3.5L6 0L2.5 3.5" }));
  parent.append(node);
  return {
    draw() {
      const only = crossings();
      const usable = only.length === 1 && scene.inSight(only[0].rad_s) && scene.gain.from < 0 && scene.gain.to > 0;
      show(node, usable);
      if (!usable) return;
      place.x = scene.x.px(wanted());
      place.y = scene.gain.px(0);
      set(node, { transform: `translate(${place.x.toFixed(1)} ${place.y.toFixed(1)})` });
      node.classList.toggle("is-lit", /** @type {any} */ (scene.store.ui.focusedStage) === "gain");
      speak();
    },
    /** @returns {import("./labels.js").Box[]} */
    boxes: () => (node.style.display === "none" ? [] : [{ x: place.x - 18, y: place.y - 11, width: 36, height: 22 }]),
  };
}
