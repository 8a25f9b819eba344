// Times the kernels in WebAssembly and prints them beside the native ones of the same run; the sums must be the same bits.
import { readFileSync } from "node:fs";

const [native, ...modules] = process.argv.slice(2);
const { parity } = JSON.parse(readFileSync(native, "utf8"));
const must = { polynomials: 1.6, lu: 1.3 };
const bits = (value) => { const view = new DataView(new ArrayBuffer(8)); view.setFloat64(0, value); return view.getBigUint64(0).toString(16).padStart(16, "0"); };
const median = (list) => list.sort((a, b) => a - b)[list.length >> 1];
let same = true;
console.log("wasm beside native, the same kernels in one run (a ratio above 1: wasm is slower)");
for (const [label, file] of modules.map((m) => m.split("="))) {
  const { instance } = await WebAssembly.instantiate(readFileSync(file));
  for (const kernel of ["polynomials", "lu"]) {
    const run = instance.exports[kernel];
    const [expected, seconds] = parity[kernel];
    const got = bits(run());
    same &&= got === expected;
    for (let i = 0; i < 300; i++) run();
    const took = [];
    for (let i = 0; i < 1001; i++) { const began = process.hrtime.bigint(); run(); took.push(Number(process.hrtime.bigint() - began) / 1e9); }
    const ratio = median(took) / Number(seconds);
    console.log(`  ${label.padEnd(9)} ${kernel.padEnd(12)} ${(median(took) * 1e6).toFixed(1).padStart(8)} µs  native ${(Number(seconds) * 1e6).toFixed(1).padStart(8)} µs  ratio ${ratio.toFixed(2)}  (must ${must[kernel]})  ${got === expected ? "same bits" : "OTHER BITS"}`);
  }
}
process.exit(same ? 0 : 1);
