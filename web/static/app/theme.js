/** Light or dark: the system's choice until the user makes one. The colours themselves live in tokens.css. */

const dark = matchMedia("(prefers-color-scheme: dark)");

/** @param {import("./store.js").Store} store */
export function followTheme(store) {
  const apply = () => {
    const theme = shownTheme(store);
    if (document.documentElement.dataset.theme === theme) return;
    document.documentElement.dataset.theme = theme;
    store.dispatchEvent(new CustomEvent("theme", { detail: theme }));
  };
  store.addEventListener("ui", apply);
  dark.addEventListener("change", apply);
  apply();
}

/** @param {import("./store.js").Store} store @returns {"light" | "dark"} */
export function shownTheme(store) {
  if (store.ui.theme === "system") return dark.matches ? "dark" : "light";
  return /** @type {"light" | "dark"} */ (store.ui.theme);
}

/** The tokens of the theme in force, by name. @param {string[]} names @returns {Record<string, string>} */
export function tokens(...names) {
  const style = getComputedStyle(document.documentElement);
  return Object.fromEntries(names.map((name) => [name, style.getPropertyValue(`--${name}`).trim()]));
}
