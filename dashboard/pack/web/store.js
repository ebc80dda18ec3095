// The pack's data: blocks that come as script files or as data inside the page, unpacked once and kept.
"use strict";

const PACK = (() => {
  const kept = new Map(); // name: promise of {content, arrays}
  const handed = new Map(); // name: how to hand the text over
  const KINDS = { u1: Uint8Array, u2: Uint16Array, i2: Int16Array, u4: Uint32Array, f4: Float32Array };
  const LETTERS = "ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/";

  function bytesOf(text) {
    if (Uint8Array.fromBase64) return Uint8Array.fromBase64(text);
    const value = new Uint8Array(128);
    for (let i = 0; i < 64; i += 1) value[LETTERS.charCodeAt(i)] = i;
    const end = text.endsWith("==") ? 2 : text.endsWith("=") ? 1 : 0;
    const out = new Uint8Array((text.length / 4) * 3 - end);
    for (let i = 0, o = 0; i < text.length; i += 4) {
      const word = (value[text.charCodeAt(i)] << 18) | (value[text.charCodeAt(i + 1)] << 12) |
        (value[text.charCodeAt(i + 2)] << 6) | value[text.charCodeAt(i + 3)];
      out[o++] = word >> 16;
      out[o++] = word >> 8; // past the end nothing is written
      out[o++] = word;
    }
    return out;
  }

  async function unpacked(text) {
    if (typeof DecompressionStream === "undefined") {
      throw new Error("This browser cannot unpack the data (it has no DecompressionStream); open the pack in a newer one.");
    }
    const stream = new Blob([bytesOf(text)]).stream().pipeThrough(new DecompressionStream("gzip"));
    const buffer = await new Response(stream).arrayBuffer();
    const length = new DataView(buffer).getUint32(0, true);
    const head = JSON.parse(new TextDecoder().decode(new Uint8Array(buffer, 4, length)));
    const arrays = {};
    let at = 4 + length;
    for (const [name, kind, size] of head.arrays) {
      const width = Number(kind[1]);
      arrays[name] = arrayOf(buffer.slice(at, at + size * width), kind, size);
      at += size * width;
    }
    return { content: head.content, arrays };
  }

  // 16-bit numbers stand as two planes, low bytes first.
  function arrayOf(buffer, kind, size) {
    if (kind[1] !== "2") return new KINDS[kind](buffer);
    const planes = new Uint8Array(buffer), out = new Uint16Array(size);
    for (let i = 0; i < size; i += 1) out[i] = planes[i] | (planes[size + i] << 8);
    return kind === "i2" ? new Int16Array(out.buffer) : out;
  }

  function textOf(name) {
    const inside = document.getElementById(`data-${name}`);
    if (inside) return Promise.resolve(inside.textContent.trim());
    return new Promise((resolve, reject) => {
      handed.set(name, resolve);
      const script = document.createElement("script");
      script.src = `data/${name}.js`;
      script.onerror = () => reject(new Error(`data/${name}.js is missing from this pack; copy the whole folder again.`));
      document.head.append(script);
    });
  }

  // The item of this name; a second call gives the same promise.
  function get(name) {
    if (!kept.has(name)) kept.set(name, textOf(name).then(unpacked));
    return kept.get(name);
  }

  function put(name, text) {
    handed.get(name)?.(text);
    handed.delete(name);
  }

  return { get, put, bytesOf };
})();
