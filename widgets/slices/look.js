// What one view shows and which tool is out. Lives in the browser; another view of the same model has its own.

const DEFAULTS = {
  tool: "look", radius: 4, ball: false, compartment: 0, ownOnly: false, spare: false, cutShape: false, sphere: true,
  reach: 25, tolerance: 0.08, moveAll: true, focus: 2, crosshair: true, strength: 1, contrast: false,
  scan: "template", second: "", blend: 0.5, windows: {}, windowMark: 0, brightness: 1, showGraded: true, showChance: false,
  showUncharted: false, shown: [], range: null, mm: 1, project: 2,
};

export class LookState {
  constructor(store, changed) {
    Object.assign(this, structuredClone(DEFAULTS));
    this.store = store;
    this.changed = changed;
  }

  set(values) {
    Object.assign(this, values);
    this.changed(Object.keys(values));
  }

  /** Goes back to the template where a scan that was shown is no longer there. */
  dropLost() {
    const there = (key) => this.store.scans.some((scan) => scan.key === key);
    if (!there(this.scan)) this.scan = "template";
    if (!there(this.second)) this.second = "";
  }

  /** Window of a scan: the user's, or the one it came with. */
  windowOf(scan) {
    return this.windows[scan.key] || scan.window;
  }

  setWindow(key, window) {
    this.windows[key] = window;
    this.set({ windowMark: this.windowMark + 1 });
  }

  /** Tolerance of growing, in the scan's own units: a share of the window's width. */
  toleranceOf() {
    const scan = this.store.scans.find((s) => s.key === this.scan);
    const [low, high] = this.windowOf(scan);
    return (high - low) * this.tolerance;
  }
}
