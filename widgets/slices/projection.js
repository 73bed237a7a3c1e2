// The maximum projection: the brightest of the scan and the whole drawing, seen through, along one axis.
import { h, mark, say, segmented } from "../front/kit.js";
import { flipOf, letters, Sight } from "./geometry.js";
import { COMPARTMENTS, FILM, FILM_GREY, hatchPattern, LINE } from "./looks.js";
import { pathOf, traceLoops } from "./outline.js";
import { inPlaneAxes } from "./raster.js";

const NAMES = ["sagittal", "coronal", "axial"];

export class Projection {
  constructor(view) {
    const { words, look } = view;
    this.view = view;
    this.canvas = h("canvas", { class: "bs-sheet", "aria-hidden": "true" });
    this.letters = ["left", "right", "top", "bottom"].map((side) => h("span", { class: `bs-letter bs-at-${side}` }));
    this.axis = segmented(words.project_along, [["2", words.axial_short], ["1", words.coronal_short], ["0",
      words.sagittal_short]], String(look.project), (key) => look.set({ project: Number(key) }));
    this.name = h("span", { class: "bs-place" }, h("span", { class: "bs-film-name" }, words.projection));
    this.node = h("div", { class: "bs-film bs-projection", role: "group", "aria-label": words.projection }, this.canvas,
      ...this.letters, this.name, this.axis);
    this.sight = new Sight();
    this.scans = new Map();
    this.bytes = [null, null, null];
    this.watcher = new ResizeObserver(() => this.later());
    this.watcher.observe(this.node);
    this.node.addEventListener("click", (event) => {
      if (!event.target.closest("button")) this.jump(event);
    });
  }

  close() {
    this.watcher.disconnect();
    clearTimeout(this.timer);
  }

  /** Redraws soon; a change of the drawing names its box. */
  later(box) {
    if (box === null) this.bytes = [null, null, null];
    else if (box) this.bytes.forEach((_, plane) => this.bytes[plane] && this.project(plane, box));
    clearTimeout(this.timer);
    this.timer = setTimeout(() => this.draw(), this.view.hand.drag ? 160 : 30);
  }

  /** ORs the drawing along an axis into a plane, within a box of voxels. */
  project(plane, box) {
    const { grid, bits } = this.view.store;
    const [width, height] = grid.size(plane);
    const out = this.bytes[plane] || (this.bytes[plane] = new Uint8Array(width * height));
    const [first, second] = inPlaneAxes(plane);
    const depth = grid.shape[plane];
    for (let b = box[2 * second]; b < box[2 * second + 1]; b++) {
      for (let a = box[2 * first]; a < box[2 * first + 1]; a++) {
        let byte = 0;
        let at = a * grid.step[first] + b * grid.step[second];
        for (let k = 0; k < depth; k++, at += grid.step[plane]) byte |= bits[at];
        out[b * width + a] = byte;
      }
    }
    return out;
  }

  drawing(plane) {
    const { grid, bits } = this.view.store;
    if (!bits) return null;
    return this.bytes[plane] || this.project(plane, [0, grid.shape[0], 0, grid.shape[1], 0, grid.shape[2]]);
  }

  /** The brightest value of the scan along an axis, as a sheet; kept by scan, axis and window. */
  brightest(plane) {
    const { store, look } = this.view;
    const data = store.volume(`scan:${look.scan}`);
    if (!data) return null;
    const mark = `${look.scan} ${plane} ${look.windowMark} ${store.scanMark}`;
    if (this.scans.get(plane)?.mark === mark) return this.scans.get(plane).canvas;
    const { grid } = store;
    const [width, height] = grid.size(plane);
    const [first, second] = inPlaneAxes(plane);
    const canvas = document.createElement("canvas");
    [canvas.width, canvas.height] = [width, height];
    const scan = store.scans.find((s) => s.key === look.scan);
    const limit = scan.unit === "HU" ? look.windowOf(scan)[1] : Infinity; // else the skull hides all of a CT
    const most = new Float32Array(width * height);
    for (let b = 0, n = 0; b < height; b++) {
      for (let a = 0; a < width; a++, n++) {
        let top = -32768;
        let at = a * grid.step[first] + b * grid.step[second];
        for (let k = 0; k < grid.shape[plane]; k++, at += grid.step[plane]) {
          if (data[at] > top && data[at] <= limit) top = data[at];
        }
        most[n] = top;
      }
    }
    // What is brightest along a line varies little over a brain: the window is that of the projection itself.
    const floor = scan.unit === "HU" ? look.windowOf(scan)[0] : most[0];
    const lit = most.filter((v) => v > floor).sort();
    const [low, high] = [lit[Math.floor(lit.length * 0.02)], lit[Math.floor(lit.length * 0.995)]];
    const ctx = canvas.getContext("2d");
    const image = ctx.createImageData(width, height);
    for (let n = 0, p = 0; n < most.length; n++, p += 4) {
      const share = Math.min(Math.max((most[n] - low) / (high - low || 1), 0), 1);
      const grey = most[n] > floor ? 40 + 150 * share : FILM_GREY;
      image.data[p] = image.data[p + 1] = image.data[p + 2] = grey;
      image.data[p + 3] = 255;
    }
    ctx.putImageData(image, 0, 0);
    this.scans.set(plane, { mark, canvas });
    return canvas;
  }

  draw() {
    const { store, look, radiological, words } = this.view;
    const box = this.node.getBoundingClientRect();
    if (!store.grid || box.width < 2) return;
    const ratio = Math.min(window.devicePixelRatio || 1, 3);
    const plane = look.project;
    [this.canvas.width, this.canvas.height] = [Math.round(box.width * ratio), Math.round(box.height * ratio)];
    this.sight.off = true;
    this.sight.resize(this.canvas.width, this.canvas.height, store.grid.frame(plane), flipOf(plane, radiological), 24 * ratio);
    const ctx = this.canvas.getContext("2d", { alpha: false });
    ctx.fillStyle = FILM;
    ctx.fillRect(0, 0, this.canvas.width, this.canvas.height);
    const scan = this.brightest(plane);
    ctx.setTransform(...this.sight.matrix);
    ctx.imageSmoothingQuality = "high";
    if (scan) ctx.drawImage(scan, -0.5, -0.5);
    ctx.setTransform(1, 0, 0, 1, 0, 0);
    const bytes = this.drawing(plane);
    const [width, height] = store.grid.size(plane);
    if (bytes) {
      let every = 0;
      for (const byte of bytes) every |= byte;
      for (let c = 0; c < store.styles.length; c++) {
        if (!(every & (1 << c))) continue;
        const path = new Path2D();
        path.addPath(pathOf(traceLoops(bytes.map((byte) => byte & (1 << c)), width, height)), new DOMMatrix(this.sight.matrix));
        ctx.fillStyle = hatchPattern(ctx, COMPARTMENTS[c], 0.9, ratio);
        ctx.fill(path, "evenodd");
        ctx.strokeStyle = COMPARTMENTS[c].colour;
        ctx.lineWidth = 1.3 * ratio;
        ctx.stroke(path);
      }
    }
    this.drawCursor(ctx, plane, ratio);
    letters(plane, radiological).forEach((letter, n) => {
      say(this.letters[n], words[`${letter}_letter`]);
      mark(this.letters[n], "data-letter", letter);
    });
    mark(this.node, "aria-label", `${words.projection}, ${words[NAMES[plane]]}`);
    this.axis.show(String(plane));
  }

  drawCursor(ctx, plane, ratio) {
    const [x, y] = this.sight.toScreen(...this.view.store.grid.on(plane, this.view.cursor));
    ctx.strokeStyle = LINE;
    ctx.lineWidth = 1.2 * ratio;
    ctx.beginPath();
    for (const [dx, dy] of [[1, 0], [-1, 0], [0, 1], [0, -1]]) {
      ctx.moveTo(x + dx * 4 * ratio, y + dy * 4 * ratio);
      ctx.lineTo(x + dx * 10 * ratio, y + dy * 10 * ratio);
    }
    ctx.stroke();
  }

  /** Moves the crosshair to the drawing's deepest layer under a click, or along the plane alone. */
  jump(event) {
    const { store, look, cursor } = this.view;
    const box = this.node.getBoundingClientRect();
    const ratio = this.canvas.width / box.width;
    const [a, b] = this.sight.toPlane((event.clientX - box.left) * ratio, (event.clientY - box.top) * ratio);
    const { grid, bits } = store;
    const voxel = grid.clamp(grid.at(look.project, cursor[look.project], a, b));
    const column = [];
    for (let k = 0; bits && k < grid.shape[look.project]; k++) {
      const probe = [...voxel];
      probe[look.project] = k;
      if (bits[grid.flat(probe)]) column.push(k);
    }
    if (column.length) voxel[look.project] = column[Math.floor(column.length / 2)];
    this.view.setCursor(voxel);
  }
}
