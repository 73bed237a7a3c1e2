// What a view does when a command is given: edits, display, and elements pointed out.
import { say } from "../front/kit.js";
import { commandFor } from "./commands.js";
import { WithCursor } from "./cursor.js";

/** The part of a view that obeys commands. */
export class WithActions extends WithCursor {
  command(edit) {
    this.store.edit(edit);
  }

  takeTool(tool) {
    this.hand.cancel();
    this.look.set({ tool });
    say(this.live, this.words[`tool_${tool}`]);
  }

  actAtCursor() {
    const film = this.activeFilm;
    const [a, b] = this.store.grid.on(film.plane, this.cursor);
    const [x, y] = film.sight.toScreen(a, b);
    if (this.hand.tool.act) this.hand.tool.act(film, { a, b, x, y });
    this.staleTops();
  }

  finish() {
    if (this.hand.tool.close) this.hand.tool.close();
    this.staleTops();
  }

  resize(mm) {
    this.command({ op: "resize", mm, compartment: this.look.compartment });
  }

  fillBetween() {
    this.command({ op: "fill_between", plane: this.activeFilm.plane, compartment: this.look.compartment });
  }

  addCompartment() {
    const n = this.store.styles.length;
    this.command({ op: "add_compartment", name: `${this.words.kind_other} ${n + 1}`, kind: "other", effect: 0.5 });
    this.look.set({ compartment: n });
  }

  removeCompartment(n) {
    this.look.compartment = Math.max(0, this.look.compartment - (this.look.compartment >= n ? 1 : 0));
    this.command({ op: "remove_compartment", compartment: n });
  }

  nextScan() {
    const keys = this.store.scans.map((s) => s.key);
    this.look.set({ scan: keys[(keys.indexOf(this.look.scan) + 1) % keys.length] });
  }

  setRadiological(on) {
    this.model.set("radiological", on);
    this.model.save_changes();
    this.refit();
    this.announce(this.words[on ? "radiological_on" : "neurological_on"]);
  }

  /** Tells all panels that an element was picked; this one outlines it. */
  pickElement(id) {
    this.model.set("selected", id);
    this.model.save_changes();
    this.outline(id, true);
  }

  /** Outlines an element; a passing outline makes room for the next one. */
  outline(id, passing) {
    const position = this.store.elements ? this.store.elements.ids.indexOf(id) : -1;
    const kept = this.look.shown.filter((s) => !s.passing);
    if (position < 0 || kept.some((s) => s.position === position)) return;
    this.look.set({ shown: [...kept, { position, fill: passing, segment: id.includes("."), passing }] });
  }

  selectedFromModel() {
    const id = this.model.get("selected");
    if (id) this.outline(id, true);
    else if (this.look.shown.some((s) => s.passing)) this.look.set({ shown: this.look.shown.filter((s) => !s.passing) });
  }

  toggleHelp() {
    this.help.hidden = !this.help.hidden;
    if (!this.help.hidden) this.help.focus();
    else this.activeFilm.node.focus();
  }

  key(event) {
    event.stopPropagation(); // notebooks bind plain letters
    const typing = event.target.closest("input:not([type=range]):not([type=checkbox]), select, textarea");
    if (!this.help.hidden && event.key === "Escape") {
      this.toggleHelp();
      return;
    }
    if (typing || (event.target.closest("button, summary, input") && ["Enter", " "].includes(event.key))) return;
    if (event.target.closest("input[type=range], [role=radiogroup]") && event.key.startsWith("Arrow")) return;
    if (event.key === " ") {
      this.spaceDown = true;
      event.preventDefault();
      return;
    }
    const found = commandFor(this.commands, event);
    if (!found) return;
    event.preventDefault();
    found[0].run(found[1]);
  }

  /** Whether a wheel event belongs to a scroll of the page that began outside the films. */
  scrollingPast(event) {
    const before = this.lastWheel && this.lastWheel.before;
    const passing = before && !before.over && event.timeStamp - before.at < 250;
    if (passing) this.lastWheel.over = false;
    return Boolean(passing);
  }
}
