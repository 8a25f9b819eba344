/**
 * Puts the wasm's bytes back in their order (see the site builder's `streams.rs`, which sorted them by meaning).
 * @param {string} text a character for each byte, which is its low eight bits combined with 127
 * @param {{ lengths: number[], head: number, size: number, shapes: string, bulk: string }} key
 * @returns {Uint8Array}
 */
function unpack(text, { lengths, head, size, shapes, bulk }) {
  const packed = new Uint8Array(text.length);
  for (let i = 0; i < packed.length; i++) packed[i] = text.charCodeAt(i) ^ 127; // each takes the low eight bits
  let sum = 0;
  const at = Int32Array.from(lengths, (length) => (sum += length) - length);
  const [sections, locals, code, variables, offsets, numbers, addresses, wide, floats, branches, tables, calls] = lengths.keys();
  const out = new Uint8Array(size + 8);
  let n = 0;
  const bytes = (stream, count) => { while (count-- > 0) out[n++] = packed[at[stream]++]; };
  const number = (stream) => {
    let value = 0;
    for (let shift = 0; ; shift += 7) {
      const byte = out[n++] = packed[at[stream]++];
      value |= (byte & 127) << shift;
      if (byte < 128) return value;
    }
  };
  const list = (stream, count) => { while (count-- > 0) number(stream); };
  const memory = () => { number(code); number(offsets); };
  // What follows an instruction, by the letter of its shape: one number from a stream, or more.
  const one = { "{": code, b: branches, c: calls, v: variables, o: code, n: numbers, p: addresses, w: wide };
  const more = {
    t: () => list(tables, number(tables) + 1), d: () => list(tables, 2), s: () => list(code, number(code)), m: memory,
    4: () => bytes(floats, 4), 8: () => bytes(floats, 8), x: () => list(code, +bulk[number(code)]),
    y: () => {
      const which = number(code);
      if (which < 12 || which > 83 && which < 94) memory();
      if (which === 12) bytes(floats, 16);
      if (which === 13) bytes(code, 16);
      if (which > 20 && which < 35 || which > 83 && which < 92) bytes(code, 1);
    },
  };
  const ones = Array.from(shapes, (letter) => one[letter] ?? -1);
  const mores = Array.from(shapes, (letter) => more[letter]);
  bytes(sections, head);
  // The last number of the head is that of functions.
  let first = n - 1;
  while (out[first - 1] > 127) first--;
  let functions = 0;
  for (let i = n - 1; i >= first; i--) functions = functions * 128 + (out[i] & 127);
  for (; functions > 0; functions--) {
    const start = n;
    n += 5; // room for the longest number, which says how long the body is
    for (let groups = number(locals); groups > 0; groups--) { number(locals); bytes(locals, 1); }
    for (let depth = 1; depth > 0;) {
      const op = out[n++] = packed[at[code]++];
      if (op === 0xe0) out[n - 1] = 0x41; // a constant that is long
      else if (op === 0x0b) depth--;
      else if (op > 1 && op < 5) depth++;
      if (ones[op] >= 0) number(ones[op]);
      else if (mores[op]) mores[op]();
    }
    const end = n;
    n = start;
    let length = end - start - 5;
    for (; length > 127; length >>= 7) out[n++] = length & 127 | 128;
    out[n++] = length;
    out.copyWithin(n, start + 5, end);
    n += end - start - 5;
  }
  bytes(sections, lengths[sections] - head);
  return out.subarray(0, n);
}
