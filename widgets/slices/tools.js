// Tools that follow the hand on a film. Each has some of: down, move, up, hover, act (the keyboard's click at the
// crosshair), cancel, draw. Points come as plane coordinates {a, b} and device pixels {x, y}.
import { COMPARTMENTS, LINE } from "./looks.js";
import { paintPolygon, Stroke } from "./paint.js";
import { quantised } from "./raster.js";

/** What every laying tool sends along: compartment, adding or cutting, sparing others. */
export function layFields(look, cut) {
  return cut
    ? { mode: "cut", compartment: look.ownOnly ? look.compartment : null }
    : { mode: "add", compartment: look.compartment, spare: look.spare };
}

export function ring(ctx, x, y, radius, colour, ratio) {
  for (const [width, style] of [[3 * ratio, "rgba(8,9,11,0.6)"], [1.4 * ratio, colour]]) {
    ctx.lineWidth = width;
    ctx.strokeStyle = style;
    ctx.beginPath();
    ctx.arc(x, y, Math.max(radius, 1), 0, 7);
    ctx.stroke();
  }
}

export class Brush {
  constructor(view, cut) {
    this.view = view;
    this.cut = cut;
    this.stroke = null;
  }

  begin(film) {
    const { look, store } = this.view;
    this.stroke = new Stroke(store, {
      plane: film.plane, index: film.index, radius: look.radius, ball: look.ball, ...layFields(look, this.cut),
    });
  }

  down(film, point) {
    this.film = film;
    this.begin(film);
    this.stroke.add(point.a, point.b);
  }

  move(film, point) {
    if (this.stroke) this.stroke.add(point.a, point.b);
  }

  up() {
    if (this.stroke) this.stroke.end();
    this.stroke = null;
  }

  act(film, point) {
    this.down(film, point);
    this.up();
  }

  cancel() {
    if (this.stroke) this.stroke.cancel();
    this.stroke = null;
  }

  draw(film, ctx, at) {
    if (!at) return;
    const { look } = this.view;
    const colour = this.cut ? "#ffffff" : COMPARTMENTS[look.compartment].colour;
    const [x, y] = film.sight.toScreen(at.a, at.b);
    if (at.film === film) {
      ctx.setLineDash(this.cut ? [4 * film.ratio, 3 * film.ratio] : []);
      ring(ctx, x, y, look.radius * film.sight.scale, colour, film.ratio);
      ctx.setLineDash([]);
    }
  }
}

/** Corner by corner, or as a free line while the pointer is down; closed by the first corner, a double click or Enter. */
export class Polygon {
  constructor(view) {
    this.view = view;
    this.corners = [];
  }

  down(film, point) {
    if (this.corners.length && (this.plane !== film.plane || this.index !== film.index)) this.corners = [];
    [this.plane, this.index] = [film.plane, film.index];
    const first = this.corners[0];
    if (first && this.corners.length > 2) {
      const [x, y] = film.sight.toScreen(...first);
      if (Math.hypot(point.x - x, point.y - y) < 10 * film.ratio) return this.close();
    }
    this.corners.push([point.a, point.b]);
    return undefined;
  }

  move(film, point) {
    const last = this.corners[this.corners.length - 1];
    if (last && Math.hypot(point.a - last[0], point.b - last[1]) > 1) this.corners.push([point.a, point.b]);
  }

  act(film, point) {
    this.down(film, { ...point, x: Infinity, y: Infinity });
  }

  close() {
    const { store, look } = this.view;
    if (this.corners.length > 2) {
      const points = this.corners.flat().map(quantised);
      paintPolygon(store, { plane: this.plane, index: this.index, points, ...layFields(look, look.cutShape) });
    }
    this.corners = [];
    this.view.staleTops();
  }

  cancel() {
    this.corners = [];
  }

  draw(film, ctx, at) {
    if (!this.corners.length || film.plane !== this.plane || film.index !== this.index) return;
    ctx.beginPath();
    for (const [a, b] of this.corners) ctx.lineTo(...film.sight.toScreen(a, b));
    if (at && at.film === film) ctx.lineTo(at.x, at.y);
    ctx.strokeStyle = COMPARTMENTS[this.view.look.compartment].colour;
    ctx.lineWidth = 1.8 * film.ratio;
    ctx.stroke();
    const [x, y] = film.sight.toScreen(...this.corners[0]);
    ring(ctx, x, y, 5 * film.ratio, LINE, film.ratio);
  }
}

/** Grows from a click over voxels of like intensity. */
export class Spread {
  constructor(view) {
    this.view = view;
  }

  down(film, point) {
    const { store, look } = this.view;
    const seed = store.grid.clamp(store.grid.at(film.plane, film.index, point.a, point.b));
    this.view.command({ op: "spread", seed, scan: look.scan, tolerance: look.toleranceOf(), reach_mm: look.reach,
      ...layFields(look, false) });
  }

  act(film, point) {
    this.down(film, point);
  }

  draw(film, ctx, at) {
    if (at && at.film === film) {
      const { look } = this.view;
      ctx.setLineDash([2 * film.ratio, 4 * film.ratio]);
      ring(ctx, at.x, at.y, look.reach * film.sight.scale, COMPARTMENTS[look.compartment].colour, film.ratio);
      ctx.setLineDash([]);
      ring(ctx, at.x, at.y, 3 * film.ratio, LINE, film.ratio);
    }
  }
}

/** Moves the crosshair; the other planes follow. */
export class Look {
  constructor(view) {
    this.view = view;
  }

  down(film, point) {
    this.view.moveCursor(film.plane, film.index, point.a, point.b);
  }

  move(film, point) {
    this.down(film, point);
  }
}

/** A distance on a film. */
export class Ruler {
  constructor(view) {
    this.view = view;
    this.ends = null;
  }

  down(film, point) {
    [this.plane, this.index] = [film.plane, film.index];
    this.ends = [[point.a, point.b], [point.a, point.b]];
  }

  move(film, point) {
    if (this.ends) this.ends[1] = [point.a, point.b];
    this.view.staleTops();
  }

  act(film, point) {
    if (!this.ends || this.closed) this.down(film, point);
    else this.ends[1] = [point.a, point.b];
    this.closed = !this.closed;
    this.view.announce(this.text());
  }

  up() {
    this.view.announce(this.text());
  }

  text() {
    const [[a, b], [c, d]] = this.ends;
    return `${Math.hypot(a - c, b - d).toFixed(1)} mm`;
  }

  cancel() {
    this.ends = null;
  }

  draw(film, ctx) {
    if (!this.ends || film.plane !== this.plane || film.index !== this.index) return;
    const [x0, y0] = film.sight.toScreen(...this.ends[0]);
    const [x1, y1] = film.sight.toScreen(...this.ends[1]);
    ctx.strokeStyle = LINE;
    ctx.lineWidth = 1.6 * film.ratio;
    ctx.beginPath();
    ctx.moveTo(x0, y0);
    ctx.lineTo(x1, y1);
    ctx.stroke();
    for (const [x, y] of [[x0, y0], [x1, y1]]) ring(ctx, x, y, 3.5 * film.ratio, LINE, film.ratio);
    ctx.font = `600 ${13 * film.ratio}px system-ui, sans-serif`;
    ctx.fillStyle = "#ffffff";
    ctx.strokeStyle = "rgba(8,9,11,0.85)";
    ctx.lineWidth = 4 * film.ratio;
    const [x, y] = [(x0 + x1) / 2 + 8 * film.ratio, (y0 + y1) / 2 - 8 * film.ratio];
    ctx.strokeText(this.text(), x, y);
    ctx.fillText(this.text(), x, y);
  }
}
