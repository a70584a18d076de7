/** Decodes a binary live frame: header length, JSON header, float32 arrays. */

/** @param {ArrayBuffer} buffer @returns {import("./store.js").Frame} */
export function decodeFrame(buffer) {
  const headerLength = new DataView(buffer).getUint32(0, true);
  const header = JSON.parse(new TextDecoder().decode(new Uint8Array(buffer, 4, headerLength)));
  const start = 4 + headerLength;
  const arrays = /** @type {Record<string, import("./store.js").FrameArray>} */ ({});
  for (const entry of header.arrays ?? []) {
    const length = entry.shape.reduce((/** @type {number} */ product, /** @type {number} */ size) => product * size, 1);
    arrays[entry.name] = { shape: entry.shape, data: new Float32Array(buffer, start + entry.offset, length) };
  }
  return { ...header, arrays };
}
