// Colours (Okabe and Ito) and hatches. Every compartment differs from the next in both, so that neither is needed alone.

export const COMPARTMENTS = [
  { colour: "#d55e00", hatch: "rising" }, { colour: "#56b4e9", hatch: "dots" }, { colour: "#cc79a7", hatch: "falling" },
  { colour: "#f0e442", hatch: "level" }, { colour: "#009e73", hatch: "grid" }, { colour: "#e69f00", hatch: "upright" },
  { colour: "#0072b2", hatch: "rings" }, { colour: "#e6e6e6", hatch: "dashes" },
];
export const OVERLAYS = ["#9bd7c4", "#f3cf7a", "#b8c7ff", "#f2a7c3", "#c9e07f", "#ffffff"];
export const FILM = "#0c0c0d";
export const FILM_GREY = 12; // what black is shown as, so that a scan has no visible edge on its film
export const LINE = "#ffe9c2";

const PERIOD = 8;

function ink(ctx, hatch, size) {
  const line = (x0, y0, x1, y1) => {
    ctx.beginPath();
    ctx.moveTo(x0, y0);
    ctx.lineTo(x1, y1);
    ctx.stroke();
  };
  const h = size / 2;
  if (hatch === "rising") [-size, 0, size].forEach((d) => line(d, size, d + size, 0));
  if (hatch === "falling") [-size, 0, size].forEach((d) => line(d, 0, d + size, size));
  if (hatch === "level" || hatch === "grid") line(0, h, size, h);
  if (hatch === "upright" || hatch === "grid") line(h, 0, h, size);
  if (hatch === "dashes") [[0, h / 2], [h, h * 1.5]].forEach(([x, y]) => line(x, y, x + h * 0.7, y));
  if (hatch === "dots" || hatch === "rings") {
    for (const [x, y] of [[h / 2, h / 2], [h * 1.5, h * 1.5]]) {
      ctx.beginPath();
      ctx.arc(x, y, hatch === "dots" ? size * 0.17 : size * 0.2, 0, 7);
      if (hatch === "dots") ctx.fill();
      else ctx.stroke();
    }
  }
}

const tiles = new Map();

/** A hatch as a canvas pattern; `ratio` is device pixels a CSS pixel. */
export function hatchPattern(ctx, look, strength, ratio) {
  const key = `${look.colour} ${look.hatch} ${strength.toFixed(2)} ${ratio}`;
  let tile = tiles.get(key);
  if (!tile) {
    const size = Math.round(PERIOD * ratio);
    tile = document.createElement("canvas");
    tile.width = tile.height = size;
    const pen = tile.getContext("2d");
    pen.fillStyle = pen.strokeStyle = look.colour;
    pen.globalAlpha = 0.27 * strength;
    pen.fillRect(0, 0, size, size);
    pen.globalAlpha = Math.min(1, 0.95 * strength);
    pen.lineWidth = 1.3 * ratio;
    ink(pen, look.hatch, size);
    if (tiles.size > 200) tiles.clear();
    tiles.set(key, tile);
  }
  return ctx.createPattern(tile, "repeat");
}

/** A swatch for lists. */
export function swatch(look) {
  const canvas = document.createElement("canvas");
  canvas.className = "bs-swatch";
  canvas.width = canvas.height = 40;
  canvas.setAttribute("aria-hidden", "true");
  const ctx = canvas.getContext("2d");
  ctx.fillStyle = FILM;
  ctx.fillRect(0, 0, 40, 40);
  ctx.fillStyle = hatchPattern(ctx, look, 1, 2);
  ctx.fillRect(0, 0, 40, 40);
  return canvas;
}

/** Colours 0..255 of a graded scale, from clear to full, as RGBA quadruples. */
export function gradedScale(stops) {
  const table = new Uint8ClampedArray(1024);
  for (let i = 0; i < 256; i++) {
    const x = (i / 255) * (stops.length - 1);
    const n = Math.min(Math.floor(x), stops.length - 2);
    for (let c = 0; c < 4; c++) table[4 * i + c] = stops[n][c] + (stops[n + 1][c] - stops[n][c]) * (x - n);
  }
  return table;
}

export const EFFECT_SCALE = gradedScale([[255, 220, 130, 0], [250, 190, 80, 140], [230, 120, 40, 190], [170, 40, 60, 220]]);
export const CHANCE_SCALE = gradedScale([[170, 210, 255, 0], [110, 170, 240, 120], [90, 110, 220, 170], [150, 80, 210, 215]]);
