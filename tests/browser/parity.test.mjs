// Figures of the book's stages: what the browser computes has the bits of what the command line computes.
import assert from "node:assert/strict";
import { execFileSync } from "node:child_process";
import { readFileSync } from "node:fs";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { book, fileUrl, launch, notes, open, root, site } from "./harness.mjs";

let context;
before(async () => { context = await launch(); });
after(() => context.close());

const bits = (value) => {
  const view = new DataView(new ArrayBuffer(8));
  view.setFloat64(0, value);
  return view.getBigUint64(0).toString(16).padStart(16, "0");
};

/** JSON has no infinity; both sides then say so in words. */
const number = (value) => (typeof value === "number" ? bits(value) : value === "infinity" || value === "unlimited" ? bits(Infinity) : "-");

function native() {
  const program = join(root, "target/debug/stageleaf");
  let text;
  try {
    text = execFileSync(program, ["check", "--format", "json", "site/notes"], { cwd: root, maxBuffer: 1e8 });
  } catch (error) {
    if (error.status !== 1) throw error;
    text = error.stdout;
  }
  return JSON.parse(text.toString()).stages;
}

/** The glue without the element, with its wasm, on a page of the book. */
async function engine() {
  const opened = await open(context, fileUrl(join(book, notes()[0])));
  await opened.evaluate(({ glue, hex }) => {
    window.engine = new Function(`${glue}; return stageleaf_wasm;`)();
    window.engine.initSync({ module: Uint8Array.from(hex.match(/../g), (pair) => parseInt(pair, 16)) });
  }, { glue: readFileSync(join(site, "glue.js"), "utf8"), hex: readFileSync(join(site, "stageleaf_web_bg.wasm")).toString("hex") });
  return opened;
}

test("the script's text is the wasm, byte by byte", () => {
  const script = readFileSync(join(site, "stageleaf.js"), "utf8");
  const [, text, key] = /STAGELEAF_WASM = String\.raw`([^`]*)`;\nconst STAGELEAF_KEY = (.*);\n/.exec(script);
  const unpack = new Function(`${readFileSync(join(root, "crates/stageleaf-web/unpack.js"), "utf8")}; return unpack;`)();
  const wanted = readFileSync(join(site, "stageleaf_web_bg.wasm"));
  assert.ok(wanted.length > 100_000 && WebAssembly.validate(wanted));
  assert.equal(Buffer.compare(Buffer.from(unpack(text, JSON.parse(key))), wanted), 0);
});

test("native and browser figures have the same bits", async () => {
  const opened = await engine();
  const stages = native();
  let compared = 0;
  for (const name of notes()) {
    const html = readFileSync(join(book, name), "utf8");
    const found = await opened.evaluate((html) => {
      const parsed = new DOMParser().parseFromString(html, "text/html");
      return [...parsed.querySelectorAll("stageleaf-sheet > script")].map((data) => ({
        line: JSON.parse(data.textContent).line, file: JSON.parse(data.textContent).file, text: window.engine.figures_bits(data.textContent) }));
    }, html);
    for (const sheet of found) {
      const stage = stages.find((one) => one.file === sheet.file && Math.abs(one.line - sheet.line) <= 1);
      assert.ok(stage, `${sheet.file}:${sheet.line} is in the report`);
      for (const line of sheet.text.split("\n")) {
        const [id, value, low, high] = line.split("\t");
        const figure = stage.figures[id];
        assert.ok(figure, `${id} of ${stage.name} is in the report`);
        const wanted = [number(figure.value), number(figure.low), number(figure.high)];
        assert.deepEqual([value, low, high], wanted, `${id} of ${stage.name}`);
        compared += value === "-" ? 0 : 1;
      }
    }
  }
  assert.ok(compared > 100, `${compared} figures were compared`);
  await opened.close();
});
