// The custom element: it carries events into the wasm and brings the static sheet back when anything fails.
// Its surroundings (see the site builder) define stageleaf_wasm, STAGELEAF_WASM with its key (see unpack.js) and STAGELEAF_STYLE.
if (!globalThis.customElements || customElements.get("stageleaf-sheet")) return;

const EVENTS = ["keydown", "change", "click", "pointermove", "pointerleave", "focusin", "toggle"];
const QUIET = "Values cannot be tried here: the page shows the sheet as the note has it.";

/** Compiles the wasm once. @returns {boolean} whether it is there */
let started;
function start() {
  if (started === undefined) {
    try {
      stageleaf_wasm.initSync({ module: unpack(STAGELEAF_WASM, STAGELEAF_KEY) });
      started = true;
    } catch {
      started = false; // no WebAssembly, or a policy that refuses it
    }
  }
  return started;
}

/** Adds the stylesheet by a way that strict policies allow. */
function dress() {
  if (!document.adoptedStyleSheets || dress.done) return;
  dress.done = true;
  const sheet = new CSSStyleSheet();
  sheet.replaceSync(STAGELEAF_STYLE);
  document.adoptedStyleSheets = [...document.adoptedStyleSheets, sheet];
}

const seen = globalThis.IntersectionObserver && new IntersectionObserver(
  (entries) => { for (const entry of entries) if (entry.isIntersecting) entry.target.mount(); },
  { rootMargin: "600px" },
);

class StageleafSheet extends HTMLElement {
  connectedCallback() {
    if (this.known) return; // moved within the page
    this.known = true;
    dress();
    const ready = () => {
      // A panel's own event does not bubble; capturing sees it.
      for (const name of EVENTS) this.addEventListener(name, this, name === "toggle");
      addEventListener("hashchange", () => this.guard(() => this.live.follow(location.hash.slice(1))));
      const named = location.hash.startsWith("#stageleaf-") && location.hash.includes("/" + encodeURIComponent(this.dataset.sheet) + "/");
      if (named) this.scrollIntoView();
      if (seen && !named) seen.observe(this); else this.mount();
    };
    if (document.readyState === "loading") addEventListener("DOMContentLoaded", ready, { once: true }); else ready();
  }

  mount() {
    if (this.tried) return;
    this.tried = true;
    if (seen) seen.unobserve(this);
    this.baked = this.innerHTML;
    if (!start()) return this.fail();
    try {
      this.live = new stageleaf_wasm.Live(this, location.hash.slice(1));
      this.guard(() => {});
    } catch (reason) {
      this.fail(reason);
    }
  }

  /** @param {Event} event */
  handleEvent(event) {
    if (event.type === "focusin") this.mount();
    this.guard(() => {
      if (!this.live.on(event) || this.frame) return;
      this.frame = requestAnimationFrame(() => { this.frame = 0; this.guard(() => this.live.draw()); });
    });
  }

  /** Leaves what a frame left over for when the page has time. */
  rest() {
    if (this.resting) return;
    this.resting = true;
    const go = () => { this.resting = false; this.guard(() => this.live.complete()); };
    if (globalThis.requestIdleCallback) requestIdleCallback(go, { timeout: 200 }); else setTimeout(go, 30);
  }

  /** Runs `work` unless it is running already: changes of the page cause events of their own. @param {() => void} work */
  guard(work) {
    if (!this.live || this.busy) return;
    this.busy = true;
    try { work(); if (this.live.behind()) this.rest(); } catch (reason) { this.fail(reason); } finally { this.busy = false; }
  }

  /** The sheet as the page brought it, and one quiet line. @param {unknown} reason kept for whoever looks into it */
  fail(reason) {
    this.reason = reason;
    this.broken = this.live; // kept: freeing what a panic left half-way would fail again
    this.live = undefined;
    this.removeAttribute("data-live");
    this.innerHTML = this.baked;
    const line = document.createElement("p");
    line.className = "stageleaf-quiet";
    line.setAttribute("data-by-script", "");
    line.textContent = QUIET;
    this.append(line);
  }
}
customElements.define("stageleaf-sheet", StageleafSheet);
