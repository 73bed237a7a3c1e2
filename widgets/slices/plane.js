// One film: a slice with its layers, and above it a clear sheet for crosshair, cursor and what a tool is about to do.
import { h, mark, say } from "../front/kit.js";
import { flipOf, letters, Sight } from "./geometry.js";
import { FILM, LINE } from "./looks.js";

const NAMES = ["sagittal", "coronal", "axial"];

export class Film {
  constructor(plane, view) {
    this.plane = plane;
    this.view = view;
    this.sight = new Sight();
    this.version = 0;
    this.dirty = true;
    this.dirtyTop = true;
    this.base = h("canvas", { class: "bs-sheet", "aria-hidden": "true" });
    this.top = h("canvas", { class: "bs-sheet bs-top", "aria-hidden": "true" });
    this.letters = ["left", "right", "top", "bottom"].map((side) => h("span", { class: `bs-letter bs-at-${side}` }));
    this.name = h("span", { class: "bs-film-name" }, view.words[NAMES[plane]]);
    this.position = h("span", {});
    this.place = h("span", { class: "bs-place" }, this.name, " ", this.position);
    const { words } = view;
    this.focus = h("button", { type: "button", class: "bs-enlarge", title: words.enlarge, "aria-label":
      `${words.enlarge}: ${words[NAMES[plane]]}`, onclick: () => view.look.set({ focus: plane }) }, "⤢");
    this.node = h("div", { class: "bs-film", tabindex: "0", role: "application", "data-plane": NAMES[plane],
      "aria-label": words[NAMES[plane]], "aria-roledescription": words.film }, this.base, this.top, ...this.letters,
      this.place, this.focus);
    this.watcher = new ResizeObserver(() => this.resize());
    this.watcher.observe(this.node);
  }

  close() {
    this.watcher.disconnect();
  }

  get index() {
    return this.view.cursor[this.plane];
  }

  get ratio() {
    return Math.min(window.devicePixelRatio || 1, 3);
  }

  resize() {
    const { grid } = this.view.store;
    const box = this.node.getBoundingClientRect();
    if (!grid || box.width < 2) return;
    const width = Math.round(box.width * this.ratio);
    const height = Math.round(box.height * this.ratio);
    for (const canvas of [this.base, this.top]) {
      if (canvas.width !== width) canvas.width = width;
      if (canvas.height !== height) canvas.height = height;
    }
    this.sight.resize(width, height, grid.frame(this.plane), flipOf(this.plane, this.view.radiological), 26 * this.ratio);
    this.stale();
  }

  /** Asks for a redraw: of everything, or of the clear sheet only. */
  stale(topOnly) {
    if (!topOnly) this.dirty = true;
    this.dirtyTop = true;
    this.view.requestDraw();
  }

  /** Position of a pointer event: device pixels and plane coordinates. */
  locate(event) {
    const box = this.node.getBoundingClientRect();
    const x = ((event.clientX - box.left) * this.base.width) / box.width;
    const y = ((event.clientY - box.top) * this.base.height) / box.height;
    const [a, b] = this.sight.toPlane(x, y);
    return { x, y, a, b };
  }

  draw() {
    if (!this.view.store.grid || !this.base.width) return;
    if (this.dirty) this.drawBase();
    if (this.dirtyTop) this.drawTop();
    this.dirty = this.dirtyTop = false;
  }

  drawBase() {
    const { words, radiological, layers } = this.view;
    const ctx = this.base.getContext("2d", { alpha: false });
    ctx.setTransform(1, 0, 0, 1, 0, 0);
    ctx.fillStyle = FILM;
    ctx.fillRect(0, 0, this.base.width, this.base.height);
    layers.draw(ctx, this.plane, this.index, this.sight, this.version, this.ratio);
    const mm = this.view.store.grid.toMm(this.view.cursor)[this.plane];
    const side = this.plane !== 0 ? "" : mm < 0 ? ` ${words.left_letter}` : mm > 0 ? ` ${words.right_letter}` : "";
    say(this.position, `${"xyz"[this.plane]} ${String(mm).replace("-", "\u2212")}${side}`);
    letters(this.plane, radiological).forEach((letter, n) => {
      const node = this.letters[n];
      say(node, words[`${letter}_letter`]);
      mark(node, "data-letter", letter);
      mark(node, "title", words[letter]);
    });
  }

  drawTop() {
    const ctx = this.top.getContext("2d");
    ctx.setTransform(1, 0, 0, 1, 0, 0);
    ctx.clearRect(0, 0, this.top.width, this.top.height);
    if (this.view.look.crosshair) this.drawCrosshair(ctx);
    this.view.hand.draw(this, ctx);
  }

  drawCrosshair(ctx) {
    const [x, y] = this.sight.toScreen(...this.view.store.grid.on(this.plane, this.view.cursor));
    const gap = 9 * this.ratio;
    ctx.strokeStyle = LINE;
    ctx.globalAlpha = 0.62;
    ctx.lineWidth = this.ratio;
    ctx.beginPath();
    for (const [x0, y0, x1, y1] of [[0, y, x - gap, y], [x + gap, y, this.top.width, y], [x, 0, x, y - gap],
      [x, y + gap, x, this.top.height]]) {
      ctx.moveTo(Math.round(x0) + 0.5, Math.round(y0) + 0.5);
      ctx.lineTo(Math.round(x1) + 0.5, Math.round(y1) + 0.5);
    }
    ctx.stroke();
    ctx.globalAlpha = 1;
  }
}
