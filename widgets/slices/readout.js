// Below the films: where the pointer (or else the crosshair) is, what the scan says there, and which elements lie there.
import { glyph, h, keep, mark, percent, say, setNumber } from "../front/kit.js";
import { elementOf } from "./overlays.js";

const MOST = 7;
const signed = (value) => String(Math.round(value)).replace("-", "\u2212");

export function readout(view) {
  const { words, store } = view;
  const place = h("span", { class: "bs-mm bw-number" });
  const value = h("span", { class: "bw-number bw-soft" });
  const drawn = h("span", { class: "bs-drawn" });
  const list = h("ul", { class: "bs-here", "aria-label": words.here });
  const more = h("span", { class: "bw-soft" });
  const node = h("div", { class: "bs-readout" }, h("div", { class: "bs-where" }, place, value, drawn), list, more);

  const make = (position) => {
    const e = elementOf(store, position);
    const share = h("span", { class: "bw-number bs-share" });
    const item = h("li", {}, h("button", { type: "button", class: "bw-chip", title: words.point_out, onclick: () =>
      view.pickElement(e.id) }, glyph(e.segment ? "segment" : "region"), h("span", {}, e.name),
      h("span", { class: "bw-side", title: words[e.side] }, words[`${e.side}_short`] || ""), share));
    item.change = () => {
      const lost = store.share ? store.share[position] : NaN;
      setNumber(share, `damage/${e.id}/share`, lost, percent(lost));
      mark(share, "title", words[e.segment ? "severed_share" : "lost_share"]);
    };
    return item;
  };

  /** Shows a voxel. */
  node.show = (voxel) => {
    const { grid } = store;
    if (!grid) return;
    const at = grid.clamp(voxel);
    const [x, y, z] = grid.toMm(at);
    say(place, `x ${signed(x)}  y ${signed(y)}  z ${signed(z)} mm`);
    const flat = grid.flat(at);
    const scan = store.scans.find((s) => s.key === view.look.scan);
    const data = scan && store.volumes.get(`scan:${scan.key}`);
    const shown = data ? data[flat] * scan.slope + scan.intercept : NaN;
    say(value, data ? `${scan.name} ${Math.abs(shown) >= 100 ? Math.round(shown) : shown.toPrecision(3)} ${scan.unit}` : "");
    const byte = store.bits ? store.bits[flat] : 0;
    say(drawn, store.styles.filter((_, n) => byte & (1 << n)).map((s) => s.name).join(" + "));
    const here = [...store.elementsAt(flat)];
    if (store.share) here.sort((a, b) => store.share[b] - store.share[a]);
    keep(list, here.slice(0, MOST), (p) => p, make, (item) => item.change());
    const rest = here.length - MOST;
    say(more, rest > 0 ? `+ ${rest}` : store.elements && here.length === 0 ? words.nothing_here : "");
  };
  return node;
}
