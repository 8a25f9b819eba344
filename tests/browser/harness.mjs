// What the browser tests share: a Chromium, pages that record every request and every console message, a small server.
import { execFileSync, spawnSync } from "node:child_process";
import { cpSync, existsSync, mkdtempSync, mkdirSync, readFileSync, readdirSync, statSync, writeFileSync } from "node:fs";
import { createServer } from "node:http";
import { createRequire } from "node:module";
import { tmpdir } from "node:os";
import { dirname, extname, join, normalize, resolve } from "node:path";
import { fileURLToPath } from "node:url";

export const root = resolve(fileURLToPath(import.meta.url), "../../..");
export const book = join(root, "target/book");
export const site = join(root, "target/site");
export const screens = join(root, "target/screens");
mkdirSync(screens, { recursive: true });

const require = createRequire(join(root, "target/npm/package.json"));
const { chromium } = require("playwright-core");
export const axeSource = readFileSync(require.resolve("axe-core/axe.min.js"), "utf8");

export async function launch() {
  const executablePath = process.env.CHROMIUM || ["/usr/bin/chromium", "/usr/bin/chromium-browser", "/usr/bin/google-chrome"].find(existsSync);
  if (!executablePath) throw new Error("no Chromium: name one in CHROMIUM");
  return chromium.launchPersistentContext(mkdtempSync(join(tmpdir(), "stageleaf-browser-")), {
    executablePath: spawnSync("sh", ["-c", `command -v "${executablePath}"`]).stdout.toString().trim() || executablePath,
    headless: true,
    viewport: { width: 1100, height: 900 },
    args: ["--no-sandbox", "--disable-gpu", "--no-first-run", "--disable-background-networking", "--disable-component-update", "--disable-sync"],
  });
}

/** Opens `url` in a new page; `page.seen` has its requests, console messages and errors. */
export async function open(context, url, { before } = {}) {
  const page = await context.newPage();
  page.seen = { requests: [], words: [] };
  page.on("request", (request) => page.seen.requests.push(request.url()));
  page.on("console", (message) => page.seen.words.push(`${message.type()}: ${message.text()}`));
  page.on("pageerror", (error) => page.seen.words.push(`uncaught: ${error.message}`));
  if (before) await before(page);
  await page.goto(url);
  return page;
}

/** Requests that left the machine's own files (or the server `origin`). */
export const strangers = (page, origin = "file://") => page.seen.requests.filter((url) => !url.startsWith(origin) && !url.startsWith("data:"));

export const fileUrl = (path) => "file://" + path;

/** The book's pages that hold a sheet of a note. */
export const notes = () => readdirSync(book).filter((name) => name.endsWith(".html") && !["print.html", "sheet.html", "index.html"].includes(name))
  .filter((name) => readFileSync(join(book, name), "utf8").includes("<stageleaf-sheet"));

/** Makes every sheet of the page live, seen or not, and waits for it. */
export async function awaken(page) {
  await page.evaluate(() => document.querySelectorAll("stageleaf-sheet").forEach((sheet) => sheet.mount && sheet.mount()));
  await frame(page);
}

/** Two frames: what an event asked for is done by then. */
export const frame = (page) => page.evaluate(() => new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(done))));

/** Until nothing moves: the book's side bar slides away for a third of a second after the window has become narrow. */
export async function still(page) {
  await frame(page);
  await page.evaluate(() => Promise.allSettled(document.getAnimations().map((motion) => motion.finished)));
  await frame(page);
}

/** Puts a value into a field as a reader does. */
export async function enter(page, path, value) {
  const input = page.locator(`input[data-path="${path}"]`).first();
  await input.fill(value);
  await input.press("Enter");
  await frame(page);
  return input;
}

export const limits = (page) => page.evaluate(() => Object.fromEntries(
  [...document.querySelectorAll("stageleaf-sheet ol.limits > li")].map((row) => [row.id, row.querySelector(".verdict").textContent.trim()])));

/** What only the script adds or marks is no part of the document. Runs in the page. */
export const plainDocument = (element) => {
  const copy = element.cloneNode(true);
  copy.querySelectorAll("[data-by-script]").forEach((node) => node.remove());
  // The book's writer breaks lines between elements; the renderer makes no line breaks.
  const texts = document.createTreeWalker(copy, NodeFilter.SHOW_TEXT), breaks = [];
  while (texts.nextNode()) if (/^\s*\n\s*$/.test(texts.currentNode.data)) breaks.push(texts.currentNode);
  breaks.forEach((node) => node.remove());
  return copy.querySelector(".stageleaf-body").outerHTML;
};

/** The page that the command line makes of a sheet's own data where the component `key` has `value` for `old`. */
export function editedNatively(data, key, old, value) {
  const { block, file, line, part, shelf = [] } = JSON.parse(data);
  const folder = mkdtempSync(join(tmpdir(), "stageleaf-edited-"));
  cpSync(join(root, "site/stageleaf.toml"), join(folder, "site/stageleaf.toml"));
  const changed = block.replace(new RegExp(`^(${key}\\s*=\\s*)"${old.replace(/[^\w ]/g, "\\$&")}"`, "m"), `$1"${value}"`);
  if (changed === block) throw new Error(`${file} has no ${key} = "${old}"`);
  const files = [...shelf, part, { file, text: "\n".repeat(line - 2) + "```stageleaf\n" + changed.replace(/\n?$/, "\n```\n") }];
  for (const one of files) {
    mkdirSync(dirname(join(folder, one.file)), { recursive: true });
    writeFileSync(join(folder, one.file), one.text);
  }
  return execFileSync(join(root, "target/debug/stageleaf"), ["page", file], { cwd: folder, maxBuffer: 1e8, stdio: ["ignore", "pipe", "inherit"] }).toString();
}

/** Serves `files` (path → text) over the book, with a policy. */
export async function serve({ policy, files = {} } = {}) {
  const kinds = { ".html": "text/html; charset=utf-8", ".js": "text/javascript", ".css": "text/css", ".svg": "image/svg+xml", ".woff2": "font/woff2", ".json": "application/json" };
  const server = createServer((request, response) => {
    const path = normalize(decodeURIComponent(new URL(request.url, "http://x").pathname)).replace(/^\/+/, "") || "index.html";
    const places = [join(book, path), join(site, path)].filter((place) => existsSync(place) && statSync(place).isFile());
    const body = path in files ? files[path] : places.length ? readFileSync(places[0]) : null;
    if (body === null) return response.writeHead(path === "favicon.ico" ? 204 : 404).end();
    const headers = { "content-type": kinds[extname(path)] || "application/octet-stream" };
    if (policy) headers["content-security-policy"] = policy;
    response.writeHead(200, headers).end(body);
  });
  await new Promise((done) => server.listen(0, "127.0.0.1", done));
  server.unref(); // a test that failed before it closed its server must not keep the run alive
  return { origin: `http://127.0.0.1:${server.address().port}`, close: () => { server.closeAllConnections(); server.close(); } };
}

/** The part of a book page that holds the note, without the book's own scripts: for pages with strict policies. */
export function bare(note, { script = '<script defer src="stageleaf.js"></script>', style = '<link rel="stylesheet" href="stageleaf.css">' } = {}) {
  const page = readFileSync(join(book, note), "utf8");
  const sheet = page.match(/<div class="stageleaf">[\s\S]*?<\/stageleaf-sheet>\s*<\/div>/)[0];
  return `<!DOCTYPE html><html lang="en"><head><meta charset="utf-8"><title>Note</title>${style}${script}</head><body><main><h1>Note</h1>${sheet}</main></body></html>`;
}
