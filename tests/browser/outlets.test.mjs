// Pages other than the book, under the policies that sites and wikis have.
import assert from "node:assert/strict";
import { createHash } from "node:crypto";
import { mkdtempSync, readFileSync, writeFileSync } from "node:fs";
import { tmpdir } from "node:os";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { awaken, bare, book, enter, fileUrl, frame, launch, limits, open, plainDocument, serve, site, strangers } from "./harness.mjs";

let context;
before(async () => { context = await launch(); });
after(() => context.close());

const note = "hydrophone-line-amplifier.html";
const STRICT = "default-src 'none'; script-src 'self' 'wasm-unsafe-eval'; style-src 'self'";
const NO_WASM = "default-src 'none'; script-src 'self'; style-src 'self'";
const script = () => readFileSync(join(site, "stageleaf.js"), "utf8");
const style = () => readFileSync(join(site, "stageleaf.css"), "utf8");
const single = () => bare(note, { script: `<script>${script()}</script>`, style: `<style>${style()}</style>` });

async function works(opened, view = opened) {
  await view.locator("stageleaf-sheet[data-live]").first().waitFor({ timeout: 10_000 });
  const before = await limits(view);
  await enter(view, "components.Rf", "47k 1%");
  assert.notDeepEqual(await limits(view), before);
}

test("over http the book's sheet is live and asks nobody else", async () => {
  const server = await serve();
  const opened = await open(context, `${server.origin}/${note}`);
  await awaken(opened);
  await works(opened);
  assert.deepEqual(strangers(opened, server.origin), []);
  assert.deepEqual(opened.seen.words, []);
  await opened.close();
  server.close();
});

test("a strict policy with wasm lets the sheet live", async () => {
  const server = await serve({ policy: STRICT, files: { "bare.html": bare(note) } });
  const opened = await open(context, `${server.origin}/bare.html`);
  await works(opened);
  assert.deepEqual(opened.seen.words, []);
  assert.deepEqual(strangers(opened, server.origin), []);
  await opened.close();
  server.close();
});

test("a policy without wasm leaves the static sheet and one quiet line", async () => {
  const server = await serve({ policy: NO_WASM, files: { "bare.html": bare(note) } });
  const opened = await open(context, `${server.origin}/bare.html`);
  await opened.locator("stageleaf-sheet .stageleaf-quiet").waitFor();
  assert.equal(await opened.locator("stageleaf-sheet[data-live]").count(), 0);
  assert.ok(Object.keys(await limits(opened)).length > 3, "the limits stand");
  assert.deepEqual(opened.seen.words.filter((words) => !/Content.Security.Policy/i.test(words)), []);
  await opened.close();
  server.close();
});

test("a single file lives from file://, and under a policy by hash", async () => {
  const folder = mkdtempSync(join(tmpdir(), "stageleaf-single-"));
  writeFileSync(join(folder, "single.html"), single());
  const opened = await open(context, fileUrl(join(folder, "single.html")));
  await works(opened);
  assert.deepEqual(strangers(opened), []);
  assert.deepEqual(opened.seen.words, []);
  await opened.close();
  const hash = (text) => `'sha256-${createHash("sha256").update(text).digest("base64")}'`;
  const server = await serve({ policy: `default-src 'none'; script-src ${hash(script())} 'wasm-unsafe-eval'; style-src ${hash(style())}`, files: { "single.html": single() } });
  const strict = await open(context, `${server.origin}/single.html`);
  await works(strict);
  assert.deepEqual(strict.seen.words, []);
  await strict.close();
  server.close();
});

test("a static sheet that nobody touched is left as it is", async () => {
  const server = await serve({ files: { "bare.html": bare(note) } });
  const opened = await open(context, `${server.origin}/bare.html`);
  await opened.locator("stageleaf-sheet[data-live]").first().waitFor();
  assert.equal(await opened.locator("stageleaf-sheet").getAttribute("data-mended"), null);
  await opened.close();
  server.close();
});

test("a failure inside brings the static sheet back with one quiet line", async () => {
  const server = await serve({ files: { "bare.html": bare(note) } });
  const opened = await open(context, `${server.origin}/bare.html`);
  await opened.locator("stageleaf-sheet[data-live]").first().waitFor();
  await enter(opened, "components.Rf", "10k 1%");
  await opened.evaluate(() => {
    document.querySelector("stageleaf-sheet").live.draw = () => { throw new WebAssembly.RuntimeError("unreachable"); };
  });
  await enter(opened, "components.Rf", "11k 1%");
  assert.equal(await opened.locator("stageleaf-sheet[data-live]").count(), 0);
  assert.equal(await opened.locator("stageleaf-sheet .stageleaf-quiet").count(), 1);
  const same = await opened.evaluate(({ html, plain }) => {
    const plainDocument = eval(plain);
    const sheet = (root) => plainDocument(root.querySelector("stageleaf-sheet"));
    return sheet(document) === sheet(new DOMParser().parseFromString(html, "text/html"));
  }, { html: bare(note), plain: `(${plainDocument})` });
  assert.equal(same, true);
  assert.deepEqual(opened.seen.words, []);
  await opened.close();
  server.close();
});

for (const way of ["src", "srcdoc"]) {
  test(`a sandboxed frame by ${way} is live, and shows its address to copy`, async () => {
    const attribute = way === "src" ? 'src="single.html"' : `srcdoc="${single().replaceAll("&", "&amp;").replaceAll('"', "&quot;")}"`;
    const outer = `<!DOCTYPE html><html lang="en"><head><meta charset="utf-8"><title>Wiki</title></head><body><iframe title="Sheet" width="1000" height="800" sandbox="allow-scripts" ${attribute}></iframe></body></html>`;
    const server = await serve({ files: { "single.html": single(), "wiki.html": outer } });
    const opened = await open(context, `${server.origin}/wiki.html`);
    await opened.locator("iframe").waitFor();
    const inner = opened.frames().find((one) => one !== opened.mainFrame());
    await works(opened, inner);
    await inner.getByRole("button", { name: "Link to these values" }).click();
    assert.match(await inner.locator(".stageleaf-out textarea").inputValue(), /#stageleaf-1\//);
    assert.equal(await inner.locator("stageleaf-sheet[data-live]").count(), 1);
    await opened.close();
    server.close();
  });
}

test("a sandboxed frame with a script beside it keeps the static sheet", async () => {
  const folder = mkdtempSync(join(tmpdir(), "stageleaf-frame-"));
  writeFileSync(join(folder, "bare.html"), bare(note));
  writeFileSync(join(folder, "stageleaf.js"), script());
  writeFileSync(join(folder, "stageleaf.css"), style());
  writeFileSync(join(folder, "wiki.html"), '<!DOCTYPE html><html lang="en"><head><title>Wiki</title></head><body><iframe title="Sheet" width="1000" height="800" sandbox="allow-scripts" src="bare.html"></iframe></body></html>');
  const opened = await open(context, fileUrl(join(folder, "wiki.html")));
  const inner = opened.frames().find((one) => one !== opened.mainFrame());
  await inner.locator("stageleaf-sheet ol.limits > li").first().waitFor();
  assert.ok(Object.keys(await limits(inner)).length > 3);
  await opened.close();
});

test("twenty sheets start as they are seen", async () => {
  const page = bare(note);
  const sheet = page.match(/<div class="stageleaf">[\s\S]*<\/stageleaf-sheet>\s*<\/div>/)[0];
  const id = "hydrophone-line-amplifier";
  const many = Array.from({ length: 20 }, (_, index) => sheet.replaceAll(`"${id}`, `"${id}-${index}`)).join("\n");
  const server = await serve({ files: { "many.html": page.replace(sheet, many) } });
  const opened = await open(context, `${server.origin}/many.html`);
  await opened.locator("stageleaf-sheet[data-live]").first().waitFor();
  await frame(opened);
  const early = await opened.locator("stageleaf-sheet[data-live]").count();
  assert.ok(early >= 1 && early < 20, `${early} of 20 are live before scrolling`);
  await opened.locator("stageleaf-sheet").last().scrollIntoViewIfNeeded();
  await opened.locator(`[data-sheet="${id}-19"][data-live]`).waitFor();
  assert.deepEqual(opened.seen.words, []);
  await opened.close();
  server.close();
});

