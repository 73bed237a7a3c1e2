// Small drawings for tools and commands, on a 20 x 20 field, drawn with the ink of the text.
import { s } from "../front/kit.js";

const PATHS = {
  look: "M10 3v4M10 13v4M3 10h4M13 10h4M10 10h.01",
  brush: "M16 3.5 9 11M9 11c-2.2-.4-4 .8-4.2 2.8-.1 1.2-.8 2-1.8 2.4 2.6 1 6.6.6 7.2-2.4.2-1.200-.2-2-1.200-2.800Z",
  eraser: "M8.500 16.500h8M11.500 4.500l4.500 4.500-6.500 6.500H6.500L3.500 12.500ZM7.500 8.500l4.500 4.500",
  polygon: "M4 14.500 6 5l7-1 3.500 6-5 6.500Z",
  spread: "M10 10h.01M10 6.500c2 0 3.500 1.300 3.500 3.500S12 13.500 10 13.500 6.500 12 6.500 10M10 3c4 0 7 3 7 7s-3 7-7 7-7-3-7-7",
  drop: "M10 3.500c4 0 6.500 3 6.500 6.500s-2.500 6.500-6.500 6.500S3.500 13.500 3.500 10 6 3.500 10 3.500M10 8v4M8 10h4",
  move: "M10 3v14M3 10h14M10 3 8 5M10 3l2 2M10 17l-2-2M10 17l2-2M3 10l2-2M3 10l2 2M17 10l-2-2M17 10l-2 2",
  ruler: "M3.500 13 13 3.500l3.500 3.500L7 16.500ZM6 10.500l1.500 1.500M8.500 8l1.500 1.500M11 5.500 12.500 7",
  undo: "M4 8h8a4 4 0 0 1 0 8H8M4 8l3.500-3.500M4 8l3.500 3.500",
  redo: "M16 8H8a4 4 0 0 0 0 8h4M16 8l-3.500-3.500M16 8l-3.500 3.500",
  help: "M7.500 7.500a2.500 2.500 0 1 1 3.600 2.200c-.8.4-1.100 1-1.100 1.800M10 15h.01",
  add: "M10 4.500v11M4.500 10h11",
  remove: "M5 5l10 10M15 5 5 15",
};

export function icon(name) {
  return s("svg", { class: "bs-icon", viewBox: "0 0 20 20", "aria-hidden": "true", fill: "none", stroke: "currentColor",
    "stroke-width": "1.5", "stroke-linecap": "round", "stroke-linejoin": "round" }, s("path", { d: PATHS[name] }));
}
