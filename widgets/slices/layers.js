// What lies on a film, layer by layer, each kept until something it shows has changed.
import { gradedScale, hatchPattern, COMPARTMENTS, CHANCE_SCALE, EFFECT_SCALE, FILM_GREY, OVERLAYS } from "./looks.js";
import { pathOf, traceLoops } from "./outline.js";

const UNCHARTED_LOOK = { colour: "#f0e442", hatch: "dots" };
const RANGE_SCALE = gradedScale([[0, 0, 0, 0], [120, 230, 200, 150]]);

/** A table from stored value to grey, for a window [low, high] in the scan's own units. */
export function windowTable(scan, window, signed) {
  const size = signed ? 65536 : 256;
  const table = new Uint8ClampedArray(size);
  const [low, high] = window;
  const span = Math.max(high - low, 1e-9);
  for (let n = 0; n < size; n++) {
    const stored = signed && n >= 32768 ? n - 65536 : n;
    const share = Math.min(Math.max((stored * scan.slope + scan.intercept - low) / span, 0), 1);
    table[n] = FILM_GREY + (255 - FILM_GREY) * share;
  }
  return table;
}

export class Layers {
  constructor(store, look) {
    this.store = store;
    this.look = look; // what is shown: see view.js
    this.kept = new Map();
    this.tables = new Map();
    this.flags = new Map();
  }

  /** A layer by name, made again only where its `mark` differs. */
  keep(name, mark, make) {
    const there = this.kept.get(name);
    if (there && there.mark === mark) return there.made;
    const made = make(there && there.made);
    this.kept.set(name, { mark, made });
    return made;
  }

  sheet(old, plane) {
    const [width, height] = this.store.grid.size(plane);
    if (old) return old;
    const canvas = document.createElement("canvas");
    canvas.width = width;
    canvas.height = height;
    const ctx = canvas.getContext("2d");
    return { canvas, ctx, image: ctx.createImageData(width, height), grey: new Uint16Array(width * height) };
  }

  table(key) {
    const scan = this.store.scans.find((s) => s.key === key);
    const window = this.look.windowOf(scan);
    const data = this.store.volume(`scan:${key}`);
    const signed = data instanceof Int16Array;
    const mark = `${key} ${window} ${signed}`;
    const there = this.tables.get(key);
    if (there && there.mark === mark) return there.table;
    const table = windowTable(scan, window, signed);
    this.tables.set(key, { mark, table });
    return table;
  }

  /** The background of a slice, blended; null until its volume is here. */
  background(plane, index) {
    const { store, look } = this;
    const under = store.volume(`scan:${look.scan}`);
    if (!under) return null;
    const over = look.second && look.blend > 0 ? store.volume(`scan:${look.second}`) : null;
    const mark = [index, look.scan, over ? look.second : "", over ? look.blend : 0, look.windowMark, look.brightness,
      store.scanMark].join();
    return this.keep(`back ${plane}`, mark, (old) => {
      const sheet = this.sheet(old, plane);
      const pixels = sheet.image.data;
      const unsigned = (v) => (v instanceof Int16Array ? new Uint16Array(v.buffer, v.byteOffset, v.length) : v);
      const first = store.grid.slice(unsigned(under), plane, index, sheet.grey, this.table(look.scan));
      for (let n = 0, p = 0; n < first.length; n++, p += 4) {
        pixels[p] = pixels[p + 1] = pixels[p + 2] = first[n];
        pixels[p + 3] = 255;
      }
      if (over) {
        const w = look.blend;
        const second = store.grid.slice(unsigned(over), plane, index, sheet.grey, this.table(look.second));
        for (let n = 0, p = 0; n < second.length; n++, p += 4) {
          const grey = pixels[p] * (1 - w) + second[n] * w;
          pixels[p] = pixels[p + 1] = pixels[p + 2] = grey;
        }
      }
      sheet.ctx.putImageData(sheet.image, 0, 0);
      return sheet;
    });
  }

  /** A coloured sheet of an 8-bit volume on a slice. */
  coloured(name, plane, index, scale, mark, data, map) {
    if (!data) return null;
    return this.keep(`${name} ${plane}`, `${index} ${mark}`, (old) => {
      const sheet = this.sheet(old, plane);
      const grey = this.store.grid.slice(data, plane, index, sheet.grey, map);
      const pixels = sheet.image.data;
      for (let n = 0, p = 0; n < grey.length; n++, p += 4) {
        const c = 4 * grey[n];
        for (let i = 0; i < 4; i++) pixels[p + i] = scale[c + i];
      }
      sheet.ctx.putImageData(sheet.image, 0, 0);
      return sheet;
    });
  }

  graded(plane, index) {
    const { store, look } = this;
    if (!store.gradedScale || !look.showGraded) return null;
    return this.coloured("graded", plane, index, EFFECT_SCALE, store.scanMark, store.volume("graded"));
  }

  /** The chance of being hit, shown over all that an element covers. */
  chance(plane, index) {
    const { store, look } = this;
    if (!look.showChance || !store.chance || !store.elements) return null;
    if (this.chanceMark !== store.chanceMark) {
      this.chanceMap = store.chanceOfCodes();
      this.chanceMark = store.chanceMark;
    }
    return this.coloured("chance", plane, index, CHANCE_SCALE, this.chanceMark, store.elements.codes, this.chanceMap);
  }

  /** Voxels in the range that the threshold tool shows. */
  range(plane, index) {
    const { range } = this.look;
    const data = range && this.store.volume(`scan:${range.scan}`);
    if (!data) return null;
    const scan = this.store.scans.find((s) => s.key === range.scan);
    return this.keep(`range ${plane}`, [index, range.low, range.high, range.scan].join(), (old) => {
      const sheet = this.sheet(old, plane);
      const { grid } = this.store;
      const values = grid.slice(data, plane, index, new Float32Array(sheet.grey.length));
      const pixels = sheet.image.data;
      for (let n = 0, p = 0; n < values.length; n++, p += 4) {
        const value = values[n] * scan.slope + scan.intercept;
        const c = value >= range.low && value <= range.high ? 1020 : 0;
        for (let i = 0; i < 4; i++) pixels[p + i] = RANGE_SCALE[c + i];
      }
      sheet.ctx.putImageData(sheet.image, 0, 0);
      return sheet;
    });
  }

  /** Outlines of every compartment on a slice: [{path, loops, look, style}]. */
  compartments(plane, index, version, place = "bits") {
    const { store } = this;
    if (!store.bits) return [];
    return this.keep(`${place} ${plane}`, `${index} ${version} ${store.styles.length}`, () => {
      const [width, height] = store.grid.size(plane);
      const bytes = store.grid.slice(store.bits, plane, index, new Uint8Array(width * height));
      let every = 0;
      for (const byte of bytes) every |= byte;
      const found = [];
      for (let c = 0; c < store.styles.length; c++) {
        if (!(every & (1 << c))) continue;
        const loops = traceLoops(bytes.map((byte) => byte & (1 << c)), width, height);
        found.push({ path: pathOf(loops), compartment: c });
      }
      return found;
    });
  }

  /** Outline of one element on a slice. */
  element(plane, index, position) {
    const { store } = this;
    if (!store.elements) return null;
    if (!this.flags.has(position)) this.flags.set(position, store.flagsOf(position));
    return this.keep(`element ${plane} ${position}`, index, () => {
      const [width, height] = store.grid.size(plane);
      const mask = store.grid.slice(store.elements.codes, plane, index, new Uint8Array(width * height),
        this.flags.get(position));
      return pathOf(traceLoops(mask, width, height));
    });
  }

  uncharted(plane, index) {
    const data = this.look.showUncharted && this.store.volume("uncharted");
    if (!data) return null;
    return this.keep(`uncharted ${plane}`, index, () => {
      const [width, height] = this.store.grid.size(plane);
      return pathOf(traceLoops(this.store.grid.slice(data, plane, index, new Uint8Array(width * height)), width, height));
    });
  }

  /** Draws all layers of a slice through a sight. */
  draw(ctx, plane, index, sight, version, ratio) {
    const { look, store } = this;
    const matrix = sight.matrix;
    const spread = (sheet, smooth, alpha) => {
      if (!sheet) return;
      ctx.save();
      ctx.setTransform(...matrix);
      ctx.imageSmoothingEnabled = smooth && sight.scale < 9 * ratio;
      ctx.imageSmoothingQuality = "high";
      ctx.globalAlpha = alpha;
      ctx.drawImage(sheet.canvas, -0.5, -0.5);
      ctx.restore();
    };
    const placed = (path) => {
      const onScreen = new Path2D();
      onScreen.addPath(path, new DOMMatrix(matrix));
      return onScreen;
    };
    const hatched = (path, paint, strength) => {
      const pattern = hatchPattern(ctx, paint, strength, ratio);
      pattern.setTransform(new DOMMatrix([1, 0, 0, 1, matrix[4], matrix[5]]));
      ctx.fillStyle = pattern;
      ctx.fill(path, "evenodd");
    };
    spread(this.background(plane, index), true, 1);
    spread(this.graded(plane, index), false, 0.9);
    spread(this.chance(plane, index), true, 0.9);
    spread(this.range(plane, index), false, 1);
    ctx.lineJoin = "round";
    const uncharted = this.uncharted(plane, index);
    if (uncharted) hatched(placed(uncharted), UNCHARTED_LOOK, 0.55);
    look.shown.forEach((item, n) => {
      const path = this.element(plane, index, item.position);
      if (!path) return;
      const shape = placed(path);
      ctx.strokeStyle = ctx.fillStyle = OVERLAYS[n % OVERLAYS.length];
      if (item.fill) {
        ctx.globalAlpha = 0.3;
        ctx.fill(shape, "evenodd");
      }
      ctx.globalAlpha = 0.95;
      ctx.lineWidth = 1.4 * ratio;
      ctx.setLineDash(item.segment ? [5 * ratio, 2.5 * ratio] : []);
      ctx.stroke(shape);
      ctx.setLineDash([]);
      ctx.globalAlpha = 1;
    });
    for (const { path, compartment } of this.compartments(plane, index, version)) {
      const paint = COMPARTMENTS[compartment];
      const shape = placed(path);
      if (look.strength > 0) hatched(shape, paint, look.strength);
      ctx.lineWidth = (compartment === look.compartment ? 2 : 1.4) * ratio;
      ctx.strokeStyle = "rgba(8,9,11,0.5)";
      ctx.lineWidth += 1.2 * ratio;
      ctx.stroke(shape);
      ctx.lineWidth -= 1.2 * ratio;
      ctx.strokeStyle = paint.colour;
      ctx.stroke(shape);
    }
    return store.bits !== undefined;
  }
}
