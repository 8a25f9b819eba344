// One edit as a reader makes it, in the browser: values to figures, markup, and the page patched; beside it the same
// computation natively. Prints; judges nothing.
import { execFileSync } from "node:child_process";
import { existsSync } from "node:fs";
import { join } from "node:path";
import { awaken, book, fileUrl, launch, notes, open, root } from "./harness.mjs";

const FRAME = 1000 / 60;
const median = (list) => list.toSorted((a, b) => a - b)[Math.floor(list.length / 2)];
const context = await launch();
const results = [];
for (const name of notes()) {
  const opened = await open(context, fileUrl(join(book, name)));
  await awaken(opened);
  for (const panels of ["closed", "open"]) {
    const taken = await opened.evaluate(async (panels) => {
      const sheet = document.querySelector("stageleaf-sheet");
      sheet.querySelectorAll("details").forEach((panel) => { panel.open = panels === "open"; });
      await new Promise((done) => setTimeout(done, 300));
      const input = sheet.querySelector('input[data-path^="components.R"]');
      const first = input.value;
      const taken = [];
      for (let turn = 0; turn < 60; turn++) {
        input.value = turn % 2 ? first : "10k 1%";
        const event = new Event("change", { bubbles: true });
        const began = performance.now();
        input.dispatchEvent(event);
        sheet.live.draw();
        const drawn = performance.now();
        sheet.live.complete();
        // The first few warm the code up.
        if (turn >= 10) taken.push([drawn - began, performance.now() - drawn]);
        await new Promise((done) => requestAnimationFrame(done));
      }
      return taken;
    }, panels);
    const [edit, rest] = [0, 1].map((i) => taken.map((t) => t[i]));
    const row = { name, panels, edit: median(edit), least: Math.min(...edit), rest: median(rest) };
    results.push(row);
    console.log(`browser  ${name.padEnd(36)} panels ${panels.padEnd(6)} drawn in ${row.edit.toFixed(2).padStart(6)} ms (best ${row.least.toFixed(2)}), ${(FRAME / row.edit).toFixed(1).padStart(4)} in a frame; then, when idle, ${row.rest.toFixed(2)} ms`);
  }
  await opened.close();
}
await context.close();
const closed = results.filter((row) => row.panels === "closed");
const within = closed.filter((row) => row.edit <= FRAME / 10).length;
console.log(`browser  a tenth of a frame is ${(FRAME / 10).toFixed(2)} ms: ${within} of ${closed.length} sheets are drawn within it`);

// The whole command line on the same notes: reading, figures, verdicts, all corners.
for (const [label, program] of [["debug", "target/debug/stageleaf"], ["release", "target/release/stageleaf"]]) {
  if (!existsSync(join(root, program))) continue;
  const taken = [];
  for (let turn = 0; turn < 7; turn++) {
    const began = performance.now();
    try { execFileSync(join(root, program), ["check", "site/notes"], { cwd: root, stdio: "ignore" }); } catch { /* a broken limit is no matter here */ }
    taken.push(performance.now() - began);
  }
  console.log(`native   check site/notes (${label})`.padEnd(45) + ` ${median(taken).toFixed(1).padStart(7)} ms for ${notes().length} notes`);
}
