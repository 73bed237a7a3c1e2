// Rows of the hit list out of the typed buffer, and which of them are shown in which order.

const COLUMNS = ["share", "low", "high", "overlap_ml", "clearance_mm"];
const HIT = 0.005; // below half a percent, an element counts as missed
const NEAR_MM = 10;

/** Pairs the fixed description of each element with its five numbers (little-endian float32, row by row). */
export function readRows(elements, values) {
  const count = values ? Math.floor(values.byteLength / 4 / COLUMNS.length) : 0;
  const rows = [];
  for (let i = 0; i < Math.min(count, elements.length); i += 1) {
    const [element, kind, name, side, anatomy] = elements[i];
    const row = { element, kind, name, side, anatomy };
    COLUMNS.forEach((column, j) => { row[column] = values.getFloat32(4 * (i * COLUMNS.length + j), true); });
    rows.push(row);
  }
  return rows;
}

function byShare(a, b) {
  return b.share - a.share || a.clearance_mm - b.clearance_mm || (a.element < b.element ? -1 : 1);
}

/** Rows that are hit and rows that are merely near; a search looks through all elements. */
export function split(rows, view, words) {
  const asked = view.text.trim().toLowerCase().split(/\s+/).filter(Boolean);
  const wanted = rows.filter((row) => view.kind === "all" || row.kind === view.kind)
    .filter((row) => {
      const text = `${row.name} ${row.element} ${words[row.side] || row.side}`.toLowerCase();
      return asked.every((word) => text.includes(word));
    });
  const hit = wanted.filter((row) => row.share >= HIT).sort(byShare);
  const near = wanted.filter((row) => row.share < HIT && (asked.length > 0 || row.clearance_mm <= NEAR_MM))
    .sort((a, b) => a.clearance_mm - b.clearance_mm);
  return { hit, near };
}

/** The table as tab-separated text, with unrounded numbers under the names that Python uses. */
export function asText(rows, words) {
  const head = ["element", "kind", "name", "side", ...COLUMNS, "anatomy"];
  const plain = (value) => (typeof value === "number" ? (Number.isFinite(value) ? String(value) : "") : value);
  const lines = rows.map((row) => head.map((column) => plain(row[column])).join("\t"));
  return [head.join("\t"), ...lines, "", words.caution].join("\n");
}
