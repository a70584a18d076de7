/** Starts the page: one store, the parts of the screen around it, then the first design. */

import { charts } from "./charts.js";
import { dialogs } from "./dialogs.js";
import { drawer } from "./drawer.js";
import { header } from "./header.js";
import { ledger } from "./ledger.js";
import { startLive } from "./live.js";
import { firstDesign } from "./origin.js";
import { measurePace } from "./pace.js";
import { keepPinnedDrawn } from "./pinned.js";
import { responses } from "./responses.js";
import { statusLine } from "./status.js";
import { createStore } from "./store.js";
import { followTheme } from "./theme.js";
import { historyKeys } from "./history_keys.js";
import { keepWork, keptScreen } from "./work.js";

/** @param {string} selector @returns {HTMLElement} */
const root = (selector) => /** @type {HTMLElement} */ (document.querySelector(selector));

const store = createStore();
store.setUi(keptScreen());
followTheme(store);
statusLine(root("#status"), store);
header(root("#header"), store);
const pace = measurePace(document.documentElement, store);
charts(root("#charts"), store, pace);
responses(root("#responses"), store, pace);
ledger(root("#ledger"), store);
drawer(root("#drawer"), store);
dialogs(document.body, store);
historyKeys(store);
keepPinnedDrawn(store);
startLive(store);
keepWork(store);
firstDesign(store);
