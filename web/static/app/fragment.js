/** A whole design in the fragment of a link: JSON, deflated, base64url. The fragment never reaches a server. */

const KEY = "design=";
// A fragment can be made by anyone: stop unpacking where no honest design is so long.
const LONGEST_TEXT = 4_000_000;

/** @param {any} design @returns {Promise<string>} the fragment, without # */
export async function encodeFragment(design) {
  const packed = new Blob([JSON.stringify(design)]).stream().pipeThrough(new CompressionStream("deflate-raw"));
  const bytes = new Uint8Array(await new Response(packed).arrayBuffer());
  let binary = "";
  for (const byte of bytes) binary += String.fromCharCode(byte);
  return KEY + btoa(binary).replaceAll("+", "-").replaceAll("/", "_").replaceAll("=", "");
}

/** @param {string} hash location.hash @returns {Promise<any | null>} null when the hash carries no design */
export async function decodeFragment(hash) {
  const text = hash.replace(/^#/, "");
  if (!text.startsWith(KEY)) return null;
  const binary = atob(text.slice(KEY.length).replaceAll("-", "+").replaceAll("_", "/"));
  const bytes = Uint8Array.from(binary, (character) => character.charCodeAt(0));
  const reader = new Blob([bytes]).stream().pipeThrough(new DecompressionStream("deflate-raw")).getReader();
  const decoder = new TextDecoder();
  let json = "";
  for (let part = await reader.read(); !part.done; part = await reader.read()) {
    json += decoder.decode(part.value, { stream: true });
    if (json.length > LONGEST_TEXT) throw new Error("the link carries more than a design");
  }
  return JSON.parse(json + decoder.decode());
}
