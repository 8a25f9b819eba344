// The live sheet in the book, from file:// with nothing else to reach.
import assert from "node:assert/strict";
import { readFileSync } from "node:fs";
import { join } from "node:path";
import { after, before, test } from "node:test";
import { awaken, axeSource, book, enter, editedNatively, fileUrl, frame, launch, limits, notes, open, plainDocument, screens, still, strangers } from "./harness.mjs";

let context;
before(async () => { context = await launch(); await context.setOffline(true); });
after(() => context.close());

const first = "hydrophone-line-amplifier.html";
const page = async (name = first, hash = "") => {
  const opened = await open(context, fileUrl(join(book, name)) + hash);
  await awaken(opened);
  return opened;
};

test("every note's sheet becomes live, and nothing is requested or said", async () => {
  assert.ok(notes().length >= 3, "the book holds notes with sheets");
  for (const name of notes()) {
    const opened = await page(name);
    const sheets = await opened.locator("stageleaf-sheet").count();
    assert.equal(await opened.locator("stageleaf-sheet[data-live]").count(), sheets, name);
    // Nothing that the book's own scripts do to a page touches a sheet.
    assert.equal(await opened.locator("stageleaf-sheet[data-mended]").count(), 0, name);
    assert.deepEqual(strangers(opened), [], name);
    assert.deepEqual(opened.seen.words, [], name);
    await opened.close();
  }
});

test("the static sheet and the live sheet are the same document", async () => {
  for (const name of notes()) {
    const opened = await page(name);
    const html = readFileSync(join(book, name), "utf8");
    const result = await opened.evaluate(({ html, plain }) => {
      const plainDocument = eval(plain);
      const parsed = new DOMParser().parseFromString(html, "text/html");
      return [...document.querySelectorAll("stageleaf-sheet")].map((live) => ({
        id: live.dataset.sheet,
        same: plainDocument(live) === plainDocument(parsed.querySelector(`stageleaf-sheet[data-sheet="${live.dataset.sheet}"]`)),
      }));
    }, { html, plain: `(${plainDocument})` });
    for (const sheet of result) assert.deepEqual(sheet, { id: sheet.id, same: true }, name);
    await opened.close();
  }
});

test("no two elements of a page share an id", async () => {
  for (const name of [...notes(), "sheet.html", "print.html"]) {
    const opened = await open(context, fileUrl(join(book, name)));
    const twice = await opened.evaluate(() => {
      const ids = [...document.querySelectorAll("[id]")].map((element) => element.id);
      return ids.filter((id, index) => ids.indexOf(id) !== index);
    });
    assert.deepEqual(twice, [], name);
    await opened.close();
  }
});

test("prose links lead to figures of the sheet", async () => {
  for (const name of notes()) {
    const opened = await page(name);
    const broken = await opened.evaluate(() => [...document.querySelectorAll('main a[href*="."][href^="#"]')]
      .map((link) => decodeURIComponent(link.getAttribute("href").slice(1))).filter((id) => !document.getElementById(id)));
    assert.deepEqual(broken, [], name);
    await opened.close();
  }
});

test("a value changes figures and verdicts, and can be taken back", async () => {
  const opened = await page();
  const before = await limits(opened);
  await enter(opened, "components.Rf", "47k 1% 50ppm");
  const after = await limits(opened);
  assert.notDeepEqual(after, before);
  assert.match(after["hydrophone-line-amplifier.gain_at_signal"], /breaks/, "a gain of 101 is not 20.4 ± 4 %");
  assert.match(await opened.locator("[role=status]").first().textContent(), /breaks now/);
  await opened.keyboard.press("Control+z");
  await frame(opened);
  assert.deepEqual(await limits(opened), before);
  assert.equal(await opened.locator('input[data-path="components.Rf"]').first().inputValue(), "9k1 1% 50ppm 0.25W");
  await opened.keyboard.press("Control+y");
  await frame(opened);
  assert.deepEqual(await limits(opened), after);
  await opened.getByRole("button", { name: "Back to the note" }).click();
  await frame(opened);
  assert.deepEqual(await limits(opened), before);
  assert.deepEqual(opened.seen.words, []);
  await opened.close();
});

test("arrow keys step through the series and keep the focus", async () => {
  const opened = await page();
  const input = opened.locator('input[data-path="components.Rf"]').first();
  await input.focus();
  await opened.keyboard.press("ArrowUp");
  await frame(opened);
  // IEC 60063, E24: after 9.1 comes 10.
  assert.match(await input.inputValue(), /^10k 1% 50ppm/);
  assert.equal(await opened.evaluate(() => document.activeElement.dataset.path), "components.Rf");
  await opened.keyboard.press("ArrowDown");
  await opened.keyboard.press("ArrowDown");
  await frame(opened);
  assert.match(await input.inputValue(), /^8k2 1% 50ppm/);
  await opened.keyboard.press("PageUp");
  await frame(opened);
  assert.match(await input.inputValue(), /^82k 1% 50ppm/);
  await opened.close();
});

test("Escape restores what stood before the arrows, or before typing", async () => {
  const opened = await page();
  const before = await limits(opened);
  const input = opened.locator('input[data-path="components.Rf"]').first();
  const value = () => input.inputValue();
  await input.focus();
  for (const key of ["PageUp", "ArrowUp", "ArrowUp"]) {
    await opened.keyboard.press(key);
    await frame(opened);
  }
  assert.match(await value(), /^110k/); // IEC 60063, E24: 91, 100, 110
  assert.notDeepEqual(await limits(opened), before);
  await opened.keyboard.press("Escape");
  await frame(opened);
  assert.equal(await value(), "9k1 1% 50ppm 0.25W");
  assert.deepEqual(await limits(opened), before);
  // A step that no frame has drawn yet is taken back as well.
  await opened.evaluate(() => {
    const input = document.querySelector('input[data-path="components.Rf"]');
    for (const key of ["ArrowUp", "Escape"]) input.dispatchEvent(new KeyboardEvent("keydown", { key, bubbles: true, cancelable: true }));
  });
  await frame(opened);
  assert.equal(await value(), "9k1 1% 50ppm 0.25W");
  assert.deepEqual(await limits(opened), before);
  await input.fill("12k");
  await opened.keyboard.press("Escape");
  await frame(opened);
  assert.equal(await value(), "9k1 1% 50ppm 0.25W");
  // What Enter took stands: from there the arrows go, and Escape comes back to it.
  await enter(opened, "components.Rf", "10k 1%");
  await opened.keyboard.press("ArrowUp");
  await frame(opened);
  assert.equal(await value(), "11k 1%");
  await opened.keyboard.press("Escape");
  await frame(opened);
  assert.equal(await value(), "10k 1%");
  assert.deepEqual(opened.seen.words, []);
  await opened.close();
  // A field that the note leaves empty is empty again.
  const other = await page("bridge-excitation-inverter.html");
  const unstated = other.locator(".unstated input").first();
  await unstated.fill("30 Hz");
  await unstated.press("ArrowUp");
  await frame(other);
  await unstated.press("Escape");
  await frame(other);
  assert.equal(await unstated.inputValue(), "");
  assert.equal(await other.locator("[data-section=problems]").first().isHidden(), true);
  await other.close();
});

test("arrow keys step every single value of every note", async () => {
  for (const name of notes()) {
    const opened = await page(name);
    const paths = await opened.evaluate(() => [...document.querySelectorAll("stageleaf-sheet input[data-path]")]
      .filter((input) => /^[−-]?[\d.]*[1-9]/.test(input.value) && !input.value.includes(" to ")).map((input) => input.dataset.path));
    assert.ok(paths.length > 8, `${name}: ${paths}`);
    for (const path of paths) {
      const input = opened.locator(`input[data-path="${path}"]`).first();
      const old = await input.inputValue();
      await input.focus();
      await opened.keyboard.press("ArrowUp");
      await frame(opened);
      assert.notEqual(await input.inputValue(), old, `${path} of ${name}`);
      await opened.keyboard.press("Escape");
      await frame(opened);
      assert.equal(await input.inputValue(), old, `${path} of ${name}`);
    }
    await opened.close();
  }
});

/** The note's first resistor with another value, in the sheet and natively. */
async function edited(opened) {
  const { path, old, data } = await opened.evaluate(() => {
    const sheet = document.querySelector("stageleaf-sheet");
    const input = sheet.querySelector('input[data-path^="components.R"]');
    return { path: input.dataset.path, old: input.value, data: sheet.querySelector("script").textContent };
  });
  await enter(opened, path, "8k2 2%");
  return editedNatively(data, path.split(".")[1], old, "8k2 2%");
}

/** Whether the sheet, or one section of it, is the one of a page that was made natively. */
const equals = (opened, native, selector = ".stageleaf-body") => opened.evaluate(({ native, plain, selector }) => {
  const plainDocument = eval(plain);
  const [live, made] = [document, new DOMParser().parseFromString(native, "text/html")].map((page) => {
    const body = new DOMParser().parseFromString(plainDocument(page.querySelector("stageleaf-sheet")), "text/html");
    return body.querySelector(selector);
  });
  live.querySelectorAll("details[open]").forEach((panel) => panel.removeAttribute("open"));
  live.removeAttribute("open");
  if (live.isEqualNode(made)) return "the same";
  return [...made.querySelectorAll(":scope > [data-section]")].filter((part) => !live.querySelector(`:scope > [data-section=${part.dataset.section}]`)?.isEqualNode(part))
    .map((part) => part.dataset.section).join(", ") || "another";
}, { native, plain: `(${plainDocument})`, selector });

for (const panels of ["closed", "open"]) {
  test(`after an edit the sheet is the one that the edited note gives, panels ${panels}`, async () => {
    for (const name of notes()) {
      const opened = await page(name);
      await opened.evaluate((open) => document.querySelectorAll("stageleaf-sheet details").forEach((panel) => { panel.open = open; }), panels === "open");
      await frame(opened);
      const native = await edited(opened);
      await opened.waitForFunction(() => !document.querySelector("stageleaf-sheet").live.behind());
      assert.equal(await equals(opened, native), "the same", name);
      await opened.close();
    }
  });
}

test("a panel that is opened before the page had time for it is fresh", async () => {
  for (const section of ["noise", "dc", "figures", "working"]) {
    const opened = await open(context, fileUrl(join(book, first)), { before: (fresh) => fresh.addInitScript(() => { window.requestIdleCallback = () => 0; }) });
    await awaken(opened);
    const native = await edited(opened);
    const panel = `details[data-section=${section}]`;
    assert.notEqual(await equals(opened, native, panel), "the same", `${section} waits while it is closed`);
    await opened.locator(`${panel} > summary`).click();
    await frame(opened);
    assert.equal(await equals(opened, native, panel), "the same", section);
    await opened.close();
  }
});

test("long values of the drawing are seen whole", async () => {
  const opened = await page();
  for (const value of ["91k 1% 50ppm", "9k1 0.1% 25ppm", "100n"]) {
    const path = value === "100n" ? "load.capacitance" : "components.Rf";
    const input = await enter(opened, path, value);
    const [needed, there] = await input.evaluate((node) => [node.scrollWidth, node.clientWidth]);
    assert.ok(needed <= there, `${value} needs ${needed} of ${there}`);
  }
  await opened.close();
});

test("wrong text is kept and explained, and the last good sheet stays", async () => {
  const opened = await page();
  const before = await limits(opened);
  const input = await enter(opened, "components.Rf", "91k V");
  assert.equal(await input.inputValue(), "91k V");
  assert.equal(await input.getAttribute("aria-invalid"), "true");
  const problems = await opened.locator("[data-section=problems]").first().textContent();
  assert.match(problems, /voltage/);
  assert.deepEqual(await limits(opened), before);
  // Another value may still change; the wrong one stays as it is.
  await enter(opened, "components.Rg", "510 1% 50ppm");
  assert.equal(await input.inputValue(), "91k V");
  await input.focus();
  await opened.keyboard.press("Escape");
  await frame(opened);
  assert.equal(await input.inputValue(), "9k1 1% 50ppm 0.25W");
  assert.equal(await input.getAttribute("aria-invalid"), null);
  assert.equal(await opened.locator("[data-section=problems]").first().isHidden(), true);
  await opened.close();
});

test("hostile text stays text", async () => {
  const opened = await page();
  const nasty = ['<img src=x onerror="window.hit=1">', '"><script>window.hit=1</script>', "]]>'\"\\u0000&lt;", "9".repeat(300), "-".repeat(5000), "\u202e1k", "1e999"];
  for (const text of nasty) {
    for (const path of ["components.Rf", "supply.positive", "part"]) {
      if (!await opened.locator(`input[data-path="${path}"]`).count()) continue;
      const began = Date.now();
      await enter(opened, path, text);
      assert.ok(Date.now() - began < 10_000, `${text.slice(0, 20)} in ${path} keeps the page busy`);
    }
  }
  assert.equal(await opened.evaluate(() => window.hit), undefined);
  assert.equal(await opened.locator("stageleaf-sheet img, stageleaf-sheet script:not([type='application/json'])").count(), 0);
  assert.equal(await opened.locator("stageleaf-sheet[data-live]").count(), 1, "still live");
  assert.deepEqual(opened.seen.words, []);
  assert.doesNotMatch(await opened.locator("stageleaf-sheet .stageleaf-body").textContent(), /NaN/);
  await opened.close();
});

test("values travel in the address; hostile addresses change nothing", async () => {
  const opened = await page();
  await enter(opened, "components.Rf", "10k 1%");
  await opened.getByRole("button", { name: "Link to these values" }).click();
  const link = await opened.locator(".stageleaf-out textarea").inputValue();
  const [needed, there] = await opened.locator(".stageleaf-out textarea").evaluate((box) => [box.scrollHeight, box.clientHeight]);
  assert.ok(needed <= there + 1, "the whole address is seen");
  assert.match(link, /#stageleaf-1\/hydrophone-line-amplifier\/components\.Rf=10k%201%25$/);
  assert.equal(opened.url(), link);
  await opened.close();
  const again = await page(first, "#" + link.split("#")[1]);
  assert.equal(await again.locator('input[data-path="components.Rf"]').first().inputValue(), "10k 1%");
  await again.close();
  for (const hash of ["#stageleaf-1/hydrophone-line-amplifier/components.Rf=%3Cimg%20src%3Dx%20onerror%3Dwindow.hit%3D1%3E/nothing=1/part=..%2F..%2Fx", "#stageleaf-7/x", "#stageleaf-1/%zz", "#stageleaf-1//////"]) {
    const hostile = await page(first, hash);
    assert.equal(await hostile.evaluate(() => window.hit), undefined, hash);
    assert.equal(await hostile.locator("stageleaf-sheet[data-live]").count(), 1, hash);
    assert.equal(await hostile.locator('input[data-path="components.Rf"]').first().inputValue(), "9k1 1% 50ppm 0.25W", hash);
    await hostile.close();
  }
});

test("the block is offered as text", async () => {
  const opened = await page();
  await enter(opened, "components.Rf", "10k 1%");
  await opened.getByRole("button", { name: "Copy as note block" }).click();
  const text = await opened.locator(".stageleaf-out textarea").inputValue();
  assert.match(text, /^```stageleaf\n/);
  assert.match(text, /Rf = "10k 1%"/);
  assert.match(text, /# the ±12 V converter, shared with the cell driver/, "the author's comments stay");
  await opened.close();
});

test("keys of the sheet do not turn the book's pages", async () => {
  const opened = await page();
  const url = opened.url();
  await opened.locator('input[data-path="components.Rf"]').first().focus();
  await opened.keyboard.press("ArrowRight");
  await opened.locator("button[data-act=undo]").first().focus();
  await opened.keyboard.press("ArrowRight");
  await opened.keyboard.press("s");
  await frame(opened);
  assert.equal(opened.url(), url);
  assert.equal(await opened.locator("#mdbook-search-wrapper:not(.hidden), #search-wrapper:not(.hidden)").count(), 0);
  await opened.close();
});

test("a plot reads out by keyboard and by pointer", async () => {
  const opened = await page();
  await opened.evaluate(() => { document.querySelector('details[data-section="response"]').open = true; });
  const svg = opened.locator('details[data-section="response"] figure[data-plot] > svg').first();
  const output = opened.locator('details[data-section="response"] figure[data-plot] output').first();
  await svg.focus();
  await opened.keyboard.press("Home");
  const start = await output.textContent();
  await opened.keyboard.press("ArrowRight");
  const next = await output.textContent();
  await opened.keyboard.press("End");
  const end = await output.textContent();
  assert.match(start, /Hz/);
  assert.equal(new Set([start, next, end]).size, 3);
  const box = await svg.boundingBox();
  await opened.mouse.move(box.x + box.width / 2, box.y + box.height / 2);
  assert.notEqual(await output.textContent(), end);
  assert.equal(await opened.locator('details[data-section="response"] line.cursor[visibility=visible]').count(), 1);
  await opened.close();
});

test("loading the script twice and moving a sheet are harmless", async () => {
  const opened = await page();
  await opened.addScriptTag({ path: join(book, "stageleaf.js") });
  await opened.evaluate(() => document.querySelector("main").append(document.querySelector("stageleaf-sheet")));
  await enter(opened, "components.Rf", "10k 1%");
  assert.equal(await opened.locator(".stageleaf-bar").count(), 1);
  assert.deepEqual(opened.seen.words, []);
  await opened.close();
});

test("with scripts off the sheet is complete", async () => {
  const browser = context.browser();
  const plain = browser ? await browser.newContext({ javaScriptEnabled: false, offline: true, viewport: { width: 1100, height: 900 } }) : null;
  if (!plain) throw new Error("the browser gives no second context");
  const opened = await open(plain, fileUrl(join(book, first)));
  assert.match(await opened.locator("stageleaf-sheet").innerText(), /Bandwidth/);
  assert.equal(await opened.locator("stageleaf-sheet[data-live]").count(), 0);
  await opened.screenshot({ path: join(screens, "scripts-off.png"), fullPage: true });
  await plain.close();
});

test("the empty sheet makes a block", async () => {
  const opened = await page("sheet.html");
  await opened.locator("stageleaf-sheet[data-live]").waitFor();
  // Verdicts of values that nobody chose are not shown in the head.
  assert.equal(await opened.locator("stageleaf-sheet .summary").isHidden(), true);
  assert.match(await opened.locator(".stageleaf-start").innerText(), /made-up/);
  await opened.locator("select[name=kind]").selectOption("inverting");
  await frame(opened);
  await opened.locator("select[name=part]").selectOption("cedar-45");
  await enter(opened, "components.Rf", "22k 1%");
  assert.equal(await opened.locator("stageleaf-sheet .summary").isHidden(), false);
  assert.equal(await opened.locator(".stageleaf-start").isHidden(), true);
  await opened.getByRole("button", { name: "Copy as note block" }).click();
  const text = await opened.locator(".stageleaf-out textarea").inputValue();
  assert.match(text, /stage = "inverting"/);
  assert.match(text, /part\s*= "cedar-45"/);
  assert.match(text, /Rf = "22k 1%"/);
  assert.deepEqual(strangers(opened), []);
  assert.deepEqual(opened.seen.words, []);
  await opened.screenshot({ path: join(screens, "empty-sheet.png"), fullPage: true });
  await opened.close();
});

for (const scheme of ["light", "dark"]) {
  test(`accessibility rules hold, ${scheme}`, async () => {
    for (const name of [first, "sheet.html"]) {
      const opened = await open(context, fileUrl(join(book, name)), {
        before: async (fresh) => {
          await fresh.emulateMedia({ colorScheme: scheme });
          await fresh.addInitScript((theme) => { try { localStorage.setItem("mdbook-theme", theme); } catch { /* a page without storage */ } }, scheme === "dark" ? "navy" : "light");
        },
      });
      await awaken(opened);
      await opened.evaluate(() => document.querySelectorAll("stageleaf-sheet details").forEach((panel) => { panel.open = true; }));
      await opened.evaluate(axeSource);
      const found = await opened.evaluate(() => window.axe.run("stageleaf-sheet", { runOnly: ["wcag2a", "wcag2aa", "wcag21a", "wcag21aa", "wcag22aa"] }));
      const words = found.violations.map((rule) => `${rule.id}: ${rule.nodes.slice(0, 3).map((node) => node.target.join(" ") + " " + node.failureSummary).join(" | ")}`);
      await opened.screenshot({ path: join(screens, `${name.replace(".html", "")}-${scheme}.png`), fullPage: true });
      assert.deepEqual(words, [], name);
      await opened.close();
    }
  });
}

test("on a phone the table of all figures says that it scrolls, and does", async () => {
  for (const name of [first, "sheet.html"]) {
    const opened = await page(name);
    await opened.locator("details[data-section=figures] > summary").click();
    const hint = opened.locator("details[data-section=figures] .sideways");
    assert.equal(await hint.isHidden(), true, `${name} is wide enough`);
    await opened.setViewportSize({ width: 360, height: 740 });
    await still(opened);
    assert.equal(await hint.isHidden(), false, name);
    const [wide, seen, nominal] = await opened.locator("details[data-section=figures] .scroll").evaluate((box) =>
      [box.scrollWidth, box.clientWidth, box.querySelector("tbody td").getBoundingClientRect().right - box.getBoundingClientRect().left]);
    assert.ok(wide > seen, `${name}: ${wide} of ${seen}`);
    assert.ok(nominal <= seen, `${name}: nominal values are seen without scrolling: ${nominal} of ${seen}`);
    await opened.close();
  }
});

test("phone width and print are looked at", async () => {
  const opened = await page();
  await opened.setViewportSize({ width: 360, height: 740 });
  await still(opened);
  const overflow = await opened.evaluate(() => document.documentElement.scrollWidth - document.documentElement.clientWidth);
  await opened.screenshot({ path: join(screens, "phone.png"), fullPage: true });
  assert.ok(overflow <= 0, `the page is ${overflow} px wider than a phone`);
  await opened.setViewportSize({ width: 800, height: 1100 });
  await opened.emulateMedia({ media: "print" });
  await opened.screenshot({ path: join(screens, "print.png"), fullPage: true });
  assert.equal(await opened.locator(".stageleaf-bar").first().isHidden(), true);
  await opened.close();
});
