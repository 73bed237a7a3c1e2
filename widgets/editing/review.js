// Review: what the overlay holds, the difference of two states, sending and receiving.
import { fill, freshId, h, keep, mark, say } from "../front/kit.js";
import { drawPicture } from "./picture.js";

const named = (words, name) => words[`state_${name}`] || name;

function chooser(label, change) {
  const id = freshId("state");
  const select = h("select", { id, onchange: change });
  return { node: h("span", { class: "be-row" }, h("label", { for: id, class: "bw-soft" }, label), select), select };
}

function fillStates(select, states, words, fallback) {
  const before = select.value === "" ? fallback : Math.min(Number(select.value), states.length - 1);
  select.replaceChildren(...states.map((name, n) => h("option", { value: n }, named(words, name))));
  select.value = String(before);
}

export function makeReview(env) {
  const { words, send } = env;
  const entries = h("ul", { class: "be-entries" });
  const none = h("p", { class: "bw-soft" }, words.no_entries);
  const where = h("p", { class: "bw-soft" });
  const standing = h("ul", { class: "be-faults" });
  const standingBox = h("details", {}, h("summary", {}, words.standing), standing);
  const differ = () => send({ kind: "differ", older: Number(older.select.value), newer: Number(newer.select.value) });
  const older = chooser(words.older, differ);
  const newer = chooser(words.newer, differ);
  const changes = h("ul", { class: "be-changes be-diff" });
  const picture = h("div", {});
  const same = h("p", { class: "bw-soft" });
  const file = h("input", { type: "file", accept: ".yaml,.yml", class: "be-file", "aria-label": words.import_file, onchange: async () => {
    const [chosen] = file.files;
    if (chosen) send({ kind: "import", name: chosen.name, text: await chosen.text() });
    file.value = "";
  } });
  const exportButton = h("button", { type: "button", class: "bw-button be-export", onclick: () => send({ kind: "export" }) }, words.export);
  const told = h("p", { class: "bw-soft", role: "status" });
  const incoming = h("div", { class: "be-incoming" });
  const node = h("div", { class: "be-review" },
    h("section", {}, h("h3", {}, words.entries), where, none, entries, standingBox),
    h("section", {}, h("h3", {}, words.difference), h("div", { class: "be-row" }, older.node, newer.node), same, changes, picture),
    h("section", {}, h("h3", {}, words.send), h("div", { class: "be-row" }, exportButton, h("span", { class: "be-row" }, h("span", { class: "bw-soft" }, words.import), file)), told, incoming));

  const textOf = (text) => (text ? h("details", {}, h("summary", {}, words.as_text), h("pre", { class: "be-yaml" }, text)) : null);

  function session(now) {
    if (!now.states) return;
    say(where, now.folder ? fill(words.written_to, { path: now.path }) : words.not_written);
    none.hidden = now.entries.length > 0;
    keep(entries, now.entries, (entry) => `${entry.slot.join(" ")} ${entry.draft} ${entry.text}`, (entry) => {
      const name = entry.words;
      return h("li", { class: `be-entry ${entry.draft ? "be-is-draft" : ""}`, "data-slot": entry.slot.join(" ") },
        h("div", { class: "be-row" }, entry.draft ? h("span", { class: "bw-tag" }, words.draft) : null, h("span", { class: "be-entry-words" }, entry.words),
          h("span", { class: "bw-soft" }, `${entry.author}, ${entry.date}`)),
        h("div", { class: "be-row" }, entry.draft ? h("button", { type: "button", class: "be-small", "aria-label": `${words.use_draft}: ${name}`, onclick: () => send({ kind: "use", slot: entry.slot }) }, words.use_draft) : null,
          h("button", { type: "button", class: "be-small", "aria-label": `${words.open_entry}: ${name}`, onclick: () => env.open(entry.slot[1], entry.slot[2]) }, words.open_entry),
          h("button", { type: "button", class: "be-small", "aria-label": `${words.reject}: ${name}`, onclick: () => send({ kind: "reject", slot: entry.slot }) }, words.reject)),
        textOf(entry.text));
    });
    standingBox.hidden = now.standing.length === 0;
    keep(standing, now.standing, (fault) => fault.text, (fault) => h("li", { class: "be-mild" }, fault.text));
    fillStates(older.select, now.states, words, 0);
    fillStates(newer.select, now.states, words, now.states.length - 1);
    if (env.shown() === "review") differ();
  }

  function difference(now) {
    if (!now.changes) return;
    say(same, now.changes.length ? "" : words.no_difference);
    keep(changes, now.changes, (change) => change.words, (change) => h("li", {}, change.words));
    picture.replaceChildren(...(now.picture.nodes.length ? [drawPicture(now.picture, words)] : []));
  }

  function visitor(now) {
    if (!now.entries) {
      incoming.replaceChildren();
      return;
    }
    const conflicts = now.conflicts.map((clash) => h("li", { class: "be-conflict" }, h("p", {}, clash.words), h("div", { class: "be-two" },
      h("div", {}, h("span", { class: "bw-tag" }, words.ours), h("pre", { class: "be-yaml" }, clash.first)),
      h("div", {}, h("span", { class: "bw-tag" }, words.theirs), h("pre", { class: "be-yaml" }, clash.second),
        h("button", { type: "button", class: "be-small", "aria-label": `${words.accept}: ${clash.words}`, onclick: () => send({ kind: "accept", slot: clash.slot }) }, words.accept)))));
    incoming.replaceChildren(
      h("h4", {}, fill(words.incoming_from, now)),
      h("div", { class: "be-row" }, h("button", { type: "button", class: "bw-button", onclick: () => send({ kind: "accept_all" }) }, words.accept_all),
        h("button", { type: "button", class: "bw-button", onclick: () => send({ kind: "lay" }) }, words.lay),
        h("button", { type: "button", class: "bw-button", onclick: () => send({ kind: "drop" }) }, words.drop)),
      h("p", { class: "be-label" }, now.conflicts.length ? words.conflicts : words.no_conflicts), h("ul", { class: "be-conflicts" }, conflicts),
      h("ul", { class: "be-entries" }, now.entries.map((entry) => h("li", { class: "be-entry", "data-slot": entry.slot.join(" ") },
        h("div", { class: "be-row" }, h("span", { class: "be-entry-words" }, entry.words), h("span", { class: "bw-soft" }, `${entry.author}, ${entry.date}`),
          entry.accepted ? h("span", { class: "bw-tag" }, words.accepted)
            : h("button", { type: "button", class: "be-small", disabled: !entry.fits, "aria-label": `${words.accept}: ${entry.words}`, onclick: () => send({ kind: "accept", slot: entry.slot }) }, words.accept)),
        entry.why ? h("p", { class: "be-grave" }, entry.why) : null, textOf(entry.text)))));
  }

  function save(message) {
    const url = URL.createObjectURL(new Blob([message.text], { type: "application/yaml" }));
    const link = h("a", { href: url, download: message.name, hidden: true });
    node.append(link);
    link.click();
    link.remove();
    setTimeout(() => URL.revokeObjectURL(url), 1000);
    say(told, fill(words.exported, { name: message.name }));
    mark(told, "data-text", message.text.length);
  }
  return { node, session, difference, visitor, save, differ };
}
