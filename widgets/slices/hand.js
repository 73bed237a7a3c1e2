// The hand on the films: pointer, pen and fingers, wheel and pinch, handed to the tool that is out.
import { Brush, Look, Polygon, Ruler, Spread } from "./tools.js";
import { Drop, Move } from "./solids.js";

export const TOOLS = ["look", "brush", "eraser", "polygon", "spread", "drop", "move", "ruler"];

export class Hand {
  constructor(view) {
    this.view = view;
    this.tools = {
      look: new Look(view), brush: new Brush(view, false), eraser: new Brush(view, true), polygon: new Polygon(view),
      spread: new Spread(view), drop: new Drop(view), move: new Move(view), ruler: new Ruler(view),
    };
    this.at = null; // where the pointer hovers: {film, a, b, x, y}
    this.fingers = new Map();
    this.drag = null;
    this.penSeen = false;
  }

  get tool() {
    return this.tools[this.view.look.tool];
  }

  draw(film, ctx) {
    if (this.tool.draw) this.tool.draw(film, ctx, this.at);
  }

  cancel() {
    if (this.drag && this.drag.kind === "tool" && this.tool.cancel) this.tool.cancel();
    else if (this.tool.cancel) this.tool.cancel();
    this.drag = null;
    this.view.staleTops();
  }

  /** Listens on a film until `signal` aborts. */
  attend(film, signal) {
    const on = (name, call, more) => film.node.addEventListener(name, call, { signal, ...more });
    on("pointerdown", (event) => this.down(film, event));
    on("pointermove", (event) => this.moved(film, event));
    on("pointerup", (event) => this.up(film, event));
    on("pointercancel", (event) => this.up(film, event, true));
    on("pointerleave", () => this.left());
    on("dblclick", () => this.tool.close && this.view.look.tool === "polygon" && this.tool.close());
    on("contextmenu", (event) => event.preventDefault());
    on("wheel", (event) => this.wheel(film, event), { passive: false });
  }

  down(film, event) {
    if (event.target.closest("button")) return;
    film.node.focus({ preventScroll: true });
    event.preventDefault();
    film.node.setPointerCapture(event.pointerId);
    if (event.pointerType === "pen") this.penSeen = true;
    const point = film.locate(event);
    if (event.pointerType === "touch") {
      this.fingers.set(event.pointerId, point);
      if (this.fingers.size === 2) {
        if (this.drag && this.drag.kind === "tool" && this.tool.cancel) this.tool.cancel();
        this.drag = { kind: "pinch", film };
        return;
      }
    }
    const pan = event.button === 1 || event.button === 2 || this.view.spaceDown
      || (event.pointerType === "touch" && this.penSeen);
    if (pan) this.drag = { kind: "pan", film, last: point };
    else if (event.shiftKey && this.view.look.tool !== "look") {
      this.drag = { kind: "look", film };
      this.tools.look.down(film, point);
    } else {
      this.drag = { kind: "tool", film, pointer: event.pointerId };
      this.view.store.send("hand", { down: true });
      this.tool.down(film, point);
    }
    this.at = { film, ...point };
    this.view.staleTops();
  }

  moved(film, event) {
    const point = film.locate(event);
    this.at = { film, ...point };
    const { drag } = this;
    if (drag && drag.film === film) {
      if (drag.kind === "pinch") this.pinch(film, event.pointerId, point);
      else if (drag.kind === "pan") {
        film.sight.pan(point.x - drag.last.x, point.y - drag.last.y);
        drag.last = point;
        film.stale();
      } else if (drag.kind === "look") this.tools.look.move(film, point);
      else if (this.tool.move) {
        const steps = event.getCoalescedEvents ? event.getCoalescedEvents() : [];
        for (const step of steps.length ? steps : [event]) this.tool.move(film, film.locate(step));
      }
    }
    this.view.hover(this.at);
    film.stale(true);
  }

  pinch(film, id, point) {
    const others = [...this.fingers.entries()].filter(([key]) => key !== id);
    const before = this.fingers.get(id);
    if (!before || !others.length) return;
    const fixed = others[0][1];
    const gap = Math.hypot(point.x - fixed.x, point.y - fixed.y) / Math.max(Math.hypot(before.x - fixed.x,
      before.y - fixed.y), 1);
    film.sight.zoomAt((point.x + fixed.x) / 2, (point.y + fixed.y) / 2, gap);
    film.sight.pan((point.x - before.x) / 2, (point.y - before.y) / 2);
    this.fingers.set(id, point);
    film.stale();
  }

  up(film, event, lost) {
    this.fingers.delete(event.pointerId);
    const { drag } = this;
    if (!drag) return;
    if (drag.kind === "tool") {
      const { store } = this.view;
      const before = store.sentEdits;
      if (lost && this.tool.cancel) this.tool.cancel();
      else if (this.tool.up) this.tool.up();
      if (store.sentEdits === before) store.send("hand", { down: false }); // an edit says as much
    }
    if (drag.kind !== "pinch" || this.fingers.size === 0) this.drag = null;
    this.view.staleTops();
  }

  left() {
    if (this.drag) return;
    this.at = null;
    this.view.hover(null);
    this.view.staleTops();
  }

  wheel(film, event) {
    if (this.view.scrollingPast(event)) return; // a page scroll that happens to cross the film goes on
    event.preventDefault();
    event.stopPropagation();
    if (event.ctrlKey || event.metaKey) {
      const point = film.locate(event);
      film.sight.zoomAt(point.x, point.y, Math.exp(-event.deltaY * 0.01));
      film.stale();
      return;
    }
    const lines = event.deltaMode === 1 ? event.deltaY * 30 : event.deltaY;
    this.rolled = (this.rolled || 0) + lines;
    const step = Math.trunc(this.rolled / 40) || (Math.abs(lines) >= 40 ? Math.sign(lines) : 0);
    if (step) {
      this.rolled -= step * 40;
      if (Math.abs(this.rolled) > 40) this.rolled = 0;
      this.view.stepSlice(film.plane, -step);
    }
  }
}
