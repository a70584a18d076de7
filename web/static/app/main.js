/** Starts the page: one store, the parts of the screen around it, then the first design. */

import { createStore } from "./store.js";
import { startLive } from "./live.js";
import { firstDesign } from "./origin.js";
import { keepWork } from "./work.js";
import { followTheme } from "./theme.js";

const store = createStore();
followTheme(store);

/** The parts that another module draws into its own root. @type {[string, string, string][]} */
const PARTS = [
  ["./ledger.js", "ledger", "#ledger"],
  ["./drawer.js", "drawer", "#drawer"],
];

async function start() {
  const dialogs = (await import("./dialogs.js")).dialogs(document.body, store);
  for (const [file, name, root] of PARTS) {
    (await import(file))[name](document.querySelector(root), store);
  }
  startLive(store);
  keepWork(store);
  await firstDesign(store);
  return dialogs;
}

start();
