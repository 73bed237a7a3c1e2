// What one model's views share: volumes, the drawing as it stands here, and the talk with the kernel.
// Local paint holds at once. The kernel's patches carry a revision and who made the change; a patch that answers an
// older change of ours than our newest is passed over, since what it shows has been painted over already.
import { inOrder, packed } from "../front/wire.js";
import { Grid } from "./geometry.js";

const PART = 2_000_000; // bytes of a file a message; servers refuse messages above 10 MB

export class Store {
  constructor(model) {
    this.model = model;
    this.id = Math.random().toString(36).slice(2, 10);
    this.newest = 0; // running number of our newest change
    this.answered = 0;
    this.sentEdits = 0;
    this.edits = 0; // moves on with every patch
    this.revision = null;
    this.grid = null;
    this.volumes = new Map();
    this.wanted = new Set();
    this.styles = [];
    this.scans = [];
    this.ml = [];
    this.steps = [0, 0];
    this.share = null;
    this.elements = null;
    this.held = null; // voxels of the stroke in hand: flat index -> byte before it
    this.listeners = new Set();
    this.handle = inOrder((message, arrays) => this.received(message, arrays));
    this.listen = (message, buffers) => {
      if (message && message.wire) this.handle(message, buffers);
    };
    model.on("msg:custom", this.listen);
    this.send("hello");
  }

  close() {
    this.model.off("msg:custom", this.listen);
    this.listeners.clear();
  }

  on(listener) {
    this.listeners.add(listener);
    return () => this.listeners.delete(listener);
  }

  tell(event, detail) {
    for (const listener of this.listeners) listener(event, detail);
  }

  send(kind, fields, arrays) {
    const [message, buffers] = packed(kind, fields, arrays);
    this.model.send(message, undefined, buffers);
  }

  get bits() {
    return this.volumes.get("bits");
  }

  /** A volume by name; asks the kernel for it once. */
  volume(name) {
    const there = this.volumes.get(name);
    if (!there && this.grid && !this.wanted.has(name)) this.ask(name);
    return there;
  }

  ask(name) {
    this.wanted.add(name);
    this.send("want", { volume: name });
  }

  /** Sends a change made here and returns its number. */
  edit(edit, number) {
    const n = number || ++this.newest;
    this.sentEdits += 1;
    this.send("edit", { edit, origin: { view: this.id, n } });
    this.tell("sent", n);
    return n;
  }

  get waiting() {
    return this.newest - this.answered;
  }

  received(message, arrays) {
    const { kind } = message;
    if (message.origin && message.origin.view === this.id) {
      this.answered = Math.max(this.answered, message.origin.n || 0);
    }
    if (this.behind && this.waiting === 0) {
      this.behind = false;
      this.ask("bits");
    }
    if (kind === "table") this.takeTable(message);
    else if (kind === "volume") this.takeVolume(message, arrays.data.data);
    else if (kind === "patch") this.takePatch(message, arrays.bits.data);
    else if (kind === "shares") {
      this.share = arrays.share.data;
      this.tell("shares");
    } else if (kind === "chances") {
      this.chance = arrays.chance.data;
      this.chanceMark = (this.chanceMark || 0) + 1;
      this.tell("chances");
    } else if (kind === "places") this.forgetElements(message.elements);
    else if (kind === "elements") this.takeElements(message, arrays);
    else if (kind === "scans") {
      this.scans = message.scans;
      for (const name of [...this.volumes.keys()]) if (/^scan:(?!template$)/.test(name)) this.forget(name);
      this.tell("scans");
    } else this.tell(kind, message);
  }

  takeTable(message) {
    this.grid = new Grid(message.shape, message.affine);
    this.styles = message.styles;
    this.scans = message.scans;
    this.hasElements = message.elements;
    this.mostBytes = message.most_bytes;
    this.gradedScale = message.graded;
    this.count(message);
    this.revision = message.revision;
    this.forget("graded");
    this.tell("table", message);
    this.ask("bits");
  }

  forget(name) {
    this.wanted.delete(name);
    this.volumes.delete(name);
  }

  takeVolume(message, data) {
    if (message.volume === "bits" && this.bits && this.waiting > 0) {
      this.behind = true; // it lacks strokes that are on their way: ask again when they have been worked in
      return;
    }
    this.volumes.set(message.volume, data);
    if (message.volume === "bits") {
      this.revision = message.revision;
      this.held = null;
      this.tell("bits", null);
    } else this.tell("volume", message);
  }

  takePatch(message, bytes) {
    const gap = this.revision !== null && message.revision !== this.revision + 1;
    this.revision = message.revision;
    this.count(message);
    if (message.styles) {
      this.styles = message.styles;
      this.gradedScale = message.graded;
      this.forget("graded");
      this.tell("styles");
    }
    const mine = message.origin.view === this.id;
    if (gap) this.ask("bits");
    else if (!(mine && message.origin.n < this.newest) && this.bits && bytes.length) this.lay(message.box, bytes);
    this.tell("patch", message);
  }

  /** Writes a box of bytes; the stroke in hand stays on top. */
  lay([i0, i1, j0, j1, k0, k1], bytes) {
    const { bits, grid } = this;
    const run = k1 - k0;
    let from = 0;
    for (let i = i0; i < i1; i++) {
      for (let j = j0; j < j1; j++, from += run) {
        const at = i * grid.step[0] + j * grid.step[1] + k0;
        if (!this.held || this.held.size === 0) bits.set(bytes.subarray(from, from + run), at);
        else {
          for (let k = 0; k < run; k++) {
            if (this.held.has(at + k)) this.held.set(at + k, bytes[from + k]);
            else bits[at + k] = bytes[from + k];
          }
        }
      }
    }
    this.edits += 1;
    this.tell("bits", [i0, i1, j0, j1, k0, k1]);
  }

  count(message) {
    this.ml = message.ml;
    this.steps = message.steps;
  }

  takeElements(message, arrays) {
    const { ids, names } = message;
    this.elements = { ids, names, codes: arrays.codes.data, offsets: arrays.offsets.data, members: arrays.members.data };
    this.tell("elements");
  }

  /** Another graph lies under the same drawing: its elements are asked for when needed. */
  forgetElements(known) {
    this.hasElements = known;
    this.elements = null;
    this.chance = null;
    for (const name of ["elements", "uncharted"]) this.forget(name);
    this.tell("places");
  }

  /** Positions of the elements at a flat index; asks for the map when first needed. */
  elementsAt(flat) {
    if (!this.elements) {
      if (this.hasElements) this.volume("elements");
      return [];
    }
    const { codes, offsets, members } = this.elements;
    return members.subarray(offsets[codes[flat]], offsets[codes[flat] + 1]);
  }

  /** For every code of the element map, whether it holds one element. */
  flagsOf(position) {
    const { offsets, members } = this.elements;
    const flags = new Uint8Array(offsets.length - 1);
    for (let code = 0; code < flags.length; code++) {
      for (let m = offsets[code]; m < offsets[code + 1]; m++) if (members[m] === position) flags[code] = 1;
    }
    return flags;
  }

  /** For every code of the element map, the largest chance (0 to 255) of an element there to be hit; null if unknown. */
  chanceOfCodes() {
    if (!this.elements || !this.chance) return null;
    const { offsets, members } = this.elements;
    const most = new Uint8Array(offsets.length - 1);
    for (let code = 0; code < most.length; code++) {
      for (let m = offsets[code]; m < offsets[code + 1]; m++) {
        most[code] = Math.max(most[code], Math.round(255 * this.chance[members[m]]));
      }
    }
    return most;
  }

  /**
   * Sends a file in parts, each when the kernel has taken the one before; `progress` gets the share sent.
   * Throws where the file is too large, or the kernel refuses a part.
   */
  async upload(file, use, options, progress, tooLarge) {
    if (file.size > this.mostBytes) throw new Error(tooLarge);
    const upload = `${this.id}-${Date.now()}`;
    const parts = Math.max(1, Math.ceil(file.size / PART));
    for (let part = 0; part < parts; part++) {
      const data = new Uint8Array(await file.slice(part * PART, (part + 1) * PART).arrayBuffer());
      const taken = this.next((event, message) => (event === "taken" && message.upload === upload && message.part === part)
        || event === "fault");
      this.send("upload", { upload, part, parts, size: file.size, name: file.name, use, options }, { data });
      const [event, message] = await taken;
      if (event === "fault") throw new Error(message.text);
      progress((part + 1) / parts);
    }
  }

  /** Waits for an event that passes a test. */
  next(test) {
    return new Promise((resolve) => {
      const stop = this.on((event, message) => {
        if (!test(event, message)) return;
        stop();
        resolve([event, message]);
      });
    });
  }
}
