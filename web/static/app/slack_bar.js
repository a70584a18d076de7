import { el } from "./element.js";

/**
 * Room grows to the right of a centre line, shortfall to the left. One unit of slack (30°, 6 dB, a factor e)
 * fills most of a side; more never leaves the track.
 *
 * @returns {{node: HTMLElement, update: (state: {standing: string, slack: number|null|undefined, pinned?: number|null}) => void}}
 */
export function slackBar() {
  const fill = el("span", { class: "slack-fill" });
  const was = el("span", { class: "slack-was", hidden: true });
  const node = el("div", { class: "slack", "aria-hidden": "true" }, fill, was);
  return {
    node,
    update({ standing, slack, pinned }) {
      const share = shareOf(standing, slack);
      fill.style.transform = `scaleX(${Math.abs(share).toFixed(4)})`;
      node.dataset.side = share < 0 ? "short" : "room";
      node.dataset.standing = standing;
      was.hidden = typeof pinned !== "number";
      if (!was.hidden) was.style.left = `${50 + 50 * saturating(pinned)}%`;
    },
  };
}

function shareOf(standing, slack) {
  if (typeof slack === "number") return saturating(slack);
  if (standing === "met") return 1;
  return standing === "not met" ? -1 : 0;
}

function saturating(slack) {
  const size = 1 - Math.exp(-1.6 * Math.abs(slack));
  // a sliver stays visible where a limit is only just met or missed
  return Math.sign(slack) * (slack === 0 ? 0 : Math.max(size, 0.02));
}
