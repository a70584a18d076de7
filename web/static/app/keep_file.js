import { el } from "./element.js";

/**
 * Give text to the browser as a file.
 *
 * @param {string} name @param {string} text @param {string} type
 */
export function keepFile(name, text, type) {
  const address = URL.createObjectURL(new Blob([text], { type }));
  const link = el("a", { href: address, download: name });
  document.body.append(link);
  link.click();
  link.remove();
  // The download has its own copy once it has begun.
  setTimeout(() => URL.revokeObjectURL(address), 10_000);
}

/** A file name from a title: "Mast camera, yaw axis" → "mast-camera-yaw-axis". */
export function fileStem(title) {
  const plain = (title ?? "").normalize("NFKD").replace(/\p{M}/gu, "").toLowerCase();
  return plain.replace(/[^a-z0-9]+/g, "-").replace(/^-+|-+$/g, "").slice(0, 60) || "design";
}

/**
 * Copy text, and say so on the button that did it.
 *
 * @param {string} text @param {HTMLButtonElement} button @param {HTMLInputElement} [shown] selected where the clipboard is closed to us
 */
export async function copyText(text, button, shown) {
  const before = button.dataset.words ?? button.textContent;
  button.dataset.words = before;
  try {
    await navigator.clipboard.writeText(text);
    button.textContent = "copied";
  } catch {
    shown?.focus();
    shown?.select();
    button.textContent = shown ? "selected: press Ctrl+C" : "the browser refused; mark and copy it by hand";
  }
  setTimeout(() => { button.textContent = before; }, 2000);
}
