// The along-course chart: mm from one end below, mm from the other end above, shares upwards.
import { h, s } from "../front/kit.js";

const LEFT = 44, RIGHT = 16, TOP = 34, BOTTOM = 36, HEIGHT = 210;

function ticks(length) {
  const step = [1, 2, 5, 10, 20, 50].find((mm) => length / mm <= 9) || 100;
  return Array.from({ length: Math.floor(length / step) + 1 }, (_, i) => i * step);
}

function steps(places, shares, x, y) {
  return places.map((place, i) => `${x(place).toFixed(1)},${y(shares[i] || 0).toFixed(1)}`);
}

/** One of the marks of the legend: hatched area, dashed line or dotted line. */
export function sample(kind) {
  const mark = kind === "hit" ? s("rect", { class: "bw-along-hit", x: 0, y: 2, width: 22, height: 10, fill: "url(#bw-along-hatch)" })
    : s("line", { class: kind === "mean" ? "bw-along-mean" : "bw-along-usual", x1: 0, x2: 22, y1: 7, y2: 7 });
  return s("svg", { class: "bw-along-sample", width: 24, height: 14, "aria-hidden": "true" }, mark);
}

/** The picture of one course, `width` px wide. */
export function chart(course, label, width) {
  const { bins, facts, usual } = course;
  const x = (mm) => LEFT + (mm / facts.length_mm) * (width - LEFT - RIGHT);
  const y = (share) => TOP + (1 - share) * (HEIGHT - TOP - BOTTOM);
  const base = y(0);
  const marks = ticks(facts.length_mm);
  const line = steps(bins.from_start_mm, bins.share_hit, x, y);
  const rungs = [0, 0.5, 1].map((share) => [
    s("line", { class: "bw-along-grid", x1: LEFT, x2: width - RIGHT, y1: y(share), y2: y(share) }),
    s("text", { class: "bw-along-tick", x: LEFT - 8, y: y(share) + 4, "text-anchor": "end" }, `${share * 100} %`)]);
  const below = marks.map((mm) => s("text", { class: "bw-along-tick", x: x(mm), y: base + 17, "text-anchor": "middle" }, mm));
  const above = marks.map((mm) => s("text", { class: "bw-along-tick", x: x(facts.length_mm - mm), y: TOP - 10, "text-anchor": "middle" }, mm));
  const hatch = s("defs", {}, s("pattern", { id: "bw-along-hatch", width: 6, height: 6, patternUnits: "userSpaceOnUse", patternTransform: "rotate(25)" },
    s("rect", { class: "bw-along-ink", width: 6, height: 6, "fill-opacity": 0.28 }), s("rect", { class: "bw-along-ink", width: 2.2, height: 6 })));
  // The template's course is laid end to end on this one, for both join the same places.
  const scaled = usual ? usual.from_start_mm.map((mm) => (mm / usual.length_mm) * facts.length_mm) : [];
  return s("svg", { class: "bw-along-chart", width, height: HEIGHT, viewBox: `0 0 ${width} ${HEIGHT}`, role: "img", "aria-label": label },
    hatch, rungs, below, above,
    s("polygon", { class: "bw-along-hit", fill: "url(#bw-along-hatch)", points: [`${x(0)},${base}`, ...line, `${x(facts.length_mm)},${base}`].join(" ") }),
    usual ? s("polyline", { class: "bw-along-usual", points: steps(scaled, usual.share_hit, x, y).join(" ") }) : null,
    s("polyline", { class: "bw-along-mean", points: steps(bins.from_start_mm, bins.mean_effect, x, y).join(" ") }));
}

/** The two axis titles, as text that wraps. */
export function axes(words, ends, fill) {
  return [h("p", { class: "bw-along-axis bw-soft" }, `${fill(words.from_end, { place: ends[1] })} ←`),
    h("p", { class: "bw-along-axis bw-soft" }, `→ ${fill(words.from_start, { place: ends[0] })}`)];
}
