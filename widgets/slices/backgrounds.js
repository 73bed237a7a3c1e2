// Which scan lies under the drawing: one, or two blended; its window; and files to be loaded.
import { h, mark, say } from "../front/kit.js";
import { slider } from "./controls.js";

// Window presets of CT, as centre and width in Hounsfield units: common practice, no source.
const CT_WINDOWS = { brain: [40, 80], stroke: [35, 40], subdural: [75, 215], bone: [600, 2800] };

export function backgrounds(view) {
  const { words, look, store } = view;
  const first = h("select", { "aria-label": words.scan, onchange: () => look.set({ scan: first.value }) });
  const second = h("select", { "aria-label": words.second_scan, onchange: () => look.set({ second: second.value }) });
  const blend = slider(words.blend, [0, 1, 0.05], look.blend, (v) => `${Math.round(v * 100)} %`, (v) => look.set({ blend: v }));
  const field = (label) => h("input", { type: "number", step: "any", "aria-label": label });
  const low = field(words.window_low);
  const high = field(words.window_high);
  const unit = h("span", { class: "bw-soft" });
  const current = () => store.scans.find((s) => s.key === look.scan);
  const typed = () => {
    if (low.value !== "" && high.value !== "") look.setWindow(look.scan, [Number(low.value), Number(high.value)]);
  };
  low.addEventListener("change", typed);
  high.addEventListener("change", typed);
  const presets = h("div", { class: "bs-buttons" }, Object.entries(CT_WINDOWS).map(([key, [centre, width]]) =>
    h("button", { type: "button", class: "bs-button", title: `${centre - width / 2} – ${centre + width / 2} HU`, onclick: () =>
      look.setWindow(look.scan, [centre - width / 2, centre + width / 2]) }, words[`window_${key}`])));
  const back = h("button", { type: "button", class: "bs-button bs-small", onclick: () => {
    look.setWindow(look.scan, current().window);
  } }, words.window_reset);
  const node = h("details", { class: "bs-section", open: true }, h("summary", {}, h("h3", {}, words.background)),
    h("div", { class: "bs-fields" }, first, second), blend,
    h("div", { class: "bs-fields" }, h("span", { class: "bw-soft" }, words.window), low, h("span", {}, "–"), high, unit, back),
    presets, loader(view));
  let listed = "";
  node.refresh = () => {
    const scan = current();
    if (!scan) return;
    const keys = store.scans.map((s) => s.key).join();
    if (keys !== listed) {
      listed = keys;
      const options = () => store.scans.map((s) => h("option", { value: s.key }, s.name));
      first.replaceChildren(...options());
      second.replaceChildren(h("option", { value: "" }, words.no_second), ...options());
    }
    first.value = look.scan;
    second.value = look.second;
    second.hidden = store.scans.length < 2;
    blend.show(look.blend);
    blend.hidden = !look.second;
    presets.hidden = scan.unit !== "HU";
    say(unit, scan.unit);
    const [a, b] = look.windowOf(scan);
    const round = (v) => (Math.abs(v) >= 100 ? Math.round(v) : Math.round(v * 100) / 100);
    if (document.activeElement !== low) low.value = round(a);
    if (document.activeElement !== high) high.value = round(b);
  };
  return node;
}

/** Loads a file as mask, labels, graded map or scan; from the browser, or from a path on the kernel's machine. */
function loader(view) {
  const { words, store } = view;
  const uses = ["mask", "graded", "scan_t1", "scan_t1_contrast", "scan_t2", "scan_flair", "scan_dwi", "scan_swi", "scan_ct",
    "scan_other"];
  const use = h("select", { "aria-label": words.load_as }, uses.map((key) => h("option", { value: key }, words[`load_${key}`])));
  const label = h("input", { type: "number", min: "1", placeholder: words.load_label, "aria-label": words.load_label });
  const none = h("input", { type: "number", step: "any", placeholder: words.load_none, "aria-label": words.load_none });
  const full = h("input", { type: "number", step: "any", placeholder: words.load_full, "aria-label": words.load_full });
  const scale = h("div", { class: "bs-fields", hidden: true }, none, full);
  const file = h("input", { type: "file", accept: ".nii,.gz,.nii.gz,.mgz,.hdr,.img", "aria-label": words.load_file });
  const path = h("input", { type: "text", placeholder: words.load_path, "aria-label": words.load_path });
  const state = h("p", { class: "bw-soft", role: "status" });
  const wanted = () => {
    const [kind, ...sequence] = use.value.split("_");
    const number = (field) => (field.value === "" ? null : Number(field.value));
    const ends = kind === "graded" && none.value !== "" && full.value !== "" ? [number(none), number(full)] : null;
    return [kind, { sequence: sequence.join("_"), label: number(label), scale: ends }];
  };
  file.addEventListener("change", async () => {
    const [chosen] = file.files;
    if (!chosen) return;
    const [kind, options] = wanted();
    try {
      await store.upload(chosen, kind, options, (share) => say(state, share < 1
        ? `${words.loading} ${Math.round(share * 100)} %` : words.loading), words.too_large);
    } catch (error) {
      say(state, String(error.message || error));
    }
    file.value = "";
  });
  const fromPath = () => {
    if (!path.value) return;
    const [kind, options] = wanted();
    say(state, words.loading);
    store.send("path", { path: path.value, use: kind, options });
  };
  path.addEventListener("keydown", (event) => event.key === "Enter" && fromPath());
  const node = h("details", { class: "bs-load" }, h("summary", {}, words.load), h("div", { class: "bs-fields" }, use, label),
    scale, file, h("div", { class: "bs-fields" }, path, h("button", { type: "button", class: "bs-button", onclick: fromPath },
      words.load_go)), state);
  store.on((event, message) => {
    if (event === "loaded") say(state, message.note || words.loaded);
    if (event === "fault" && node.open) say(state, message.text);
  });
  use.addEventListener("change", () => {
    mark(label, "hidden", use.value !== "mask");
    mark(scale, "hidden", use.value !== "graded");
  });
  return node;
}
