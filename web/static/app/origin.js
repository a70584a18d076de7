/** Decides which design the page opens with: a link's, this tab's own work, work left behind, the landing demo. */

import { decodeFragment } from "./fragment.js";
import { ask } from "./request.js";
import { ownWork, orphanedWork } from "./work.js";

/** @param {import("./store.js").Store} store */
export async function firstDesign(store) {
  loadCatalogue(store);
  const token = document.querySelector('meta[name="loopwright-token"]')?.getAttribute("content") ?? "";
  const own = ownWork();
  try {
    if (token) return await openLink(store, token, own);
    if (location.hash.startsWith("#design=")) return await openFragment(store, location.hash, own);
  } catch (failure) {
    store.say(linkTrouble(failure), "trouble");
  }
  const work = own ?? (await orphanedWork());
  if (work?.design) return store.restore(work);
  return openLanding(store);
}

async function openLink(/** @type {import("./store.js").Store} */ store, /** @type {string} */ token, /** @type {any} */ own) {
  if (own?.origin?.token === token) return store.restore(own);
  const body = await fetched(`/api/designs/${encodeURIComponent(token)}`);
  return store.load(body.design, { origin: { kind: "link", token } });
}

async function openFragment(/** @type {import("./store.js").Store} */ store, /** @type {string} */ hash, /** @type {any} */ own) {
  if (own?.origin?.fragment === hash) return store.restore(own);
  return store.load(await decodeFragment(hash), { origin: { kind: "link", fragment: hash } });
}

async function openLanding(/** @type {import("./store.js").Store} */ store) {
  try {
    const demos = await demoList();
    const landing = demos.find((demo) => demo.landing) ?? demos[0];
    const body = await fetched(`/api/demos/${encodeURIComponent(landing.name)}`);
    store.load(body.design ?? body, { origin: { kind: "demo", name: landing.name } });
  } catch {
    store.say("No design could be opened: the server does not answer. Reload once it runs.", "trouble");
  }
}

async function loadCatalogue(/** @type {import("./store.js").Store} */ store) {
  const [demos, measures] = await Promise.all([
    demoList().catch(() => []),
    fetched("/api/measures").then((body) => body.measures ?? body).catch(() => []),
  ]);
  store.setCatalogue({ demos, measures });
}

/** @returns {Promise<any[]>} */
async function demoList() {
  const body = await fetched("/api/demos");
  return body.demos ?? body;
}

class Refused extends Error {
  constructor(/** @type {number} */ status, /** @type {{where: string, what: string}[]} */ errors) {
    super(errors.map(({ where, what }) => (where ? `${where}: ${what}` : what)).join("; "));
    this.status = status;
  }
}

/** @param {string} url @returns {Promise<any>} */
async function fetched(url) {
  const answer = await ask("GET", url);
  if (!answer.ok) throw new Refused(answer.status, answer.errors);
  return answer.body;
}

function linkTrouble(/** @type {unknown} */ failure) {
  if (failure instanceof Refused && failure.status === 404) {
    return "This link leads to no design: it was withdrawn or is incomplete. Ask for a new one.";
  }
  if (failure instanceof Refused) return `The shared design could not be opened: ${failure.message}`;
  return "This link carries no readable design; it may have been cut off when it was copied.";
}
