/**
 * Links that were made in this browser, with the keys that withdraw them. The key is told once, so it is kept here.
 *
 * @typedef {{token: string, link: string, withdraw_key: string, design_sha256: string, title: string, made_at: string}} SharedLink
 */

const PLACE = "loopwright.links";
const MOST_KEPT = 100;

/** @returns {SharedLink[]} newest first */
export function sharedLinks() {
  try {
    const kept = JSON.parse(localStorage.getItem(PLACE) ?? "[]");
    return Array.isArray(kept) ? kept : [];
  } catch {
    return [];
  }
}

/** @param {SharedLink} link @returns {boolean} whether this browser could keep the key */
export function rememberLink(link) {
  return keep([link, ...sharedLinks()].slice(0, MOST_KEPT));
}

/** @param {string} token */
export function forgetLink(token) {
  keep(sharedLinks().filter((one) => one.token !== token));
}

function keep(links) {
  try {
    localStorage.setItem(PLACE, JSON.stringify(links));
    return true;
  } catch {
    return false;
  }
}
