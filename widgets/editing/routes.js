// The routes of a function: each a chain of places with a share of the load.
import { fill, h, keep, mark, say } from "../front/kit.js";
import { makePicker } from "./picker.js";

const bare = (reference) => reference.split("@")[0];

export function makeRoutes(field, env, change) {
  const { words } = env;
  let routes = []; // [{key, name, usual_load, chain, note, id}]
  let serial = 0;
  const list = h("ol", { class: "be-list" });
  const sum = h("p", { class: "bw-soft", role: "status" });
  const share = h("button", { type: "button", class: "bw-button be-share", title: words.route_share_hint, onclick: () => {
    const total = routes.reduce((all, route) => all + (route.usual_load || 0), 0);
    if (!total) return;
    const rounded = routes.map((route) => Math.round(((route.usual_load || 0) / total) * 1000) / 1000);
    const largest = rounded.indexOf(Math.max(...rounded));
    rounded[largest] = Math.round((rounded[largest] + 1 - rounded.reduce((a, b) => a + b, 0)) * 1000) / 1000;
    routes = routes.map((route, n) => ({ ...route, usual_load: rounded[n] }));
    show();
    change();
  } }, words.route_share);
  const places = () => ["region", "segment"].flatMap((kind) => env.catalogue()[kind] || []).map(([key, name]) => [key, name]);
  const nameOf = (reference) => {
    const [key, side] = reference.split("@");
    const name = (places().find(([each]) => each === key) || [key, key])[1];
    return side ? `${name}, ${words[`${side}_only`] || words.other_side}` : name;
  };
  const freshKey = (stem) => {
    const taken = new Set(routes.map((route) => route.key));
    let key = stem;
    for (let n = 2; taken.has(key); n += 1) key = `${stem}_${n}`;
    return key;
  };
  const add = (route, after) => {
    serial += 1;
    const place = after === undefined ? routes.length : after + 1;
    routes = [...routes.slice(0, place), { id: serial, note: null, ...route }, ...routes.slice(place)];
    show();
    change();
  };
  const put = (id, values) => {
    routes = routes.map((route) => (route.id === id ? { ...route, ...values } : route));
    show();
    change();
  };
  const routeOf = (id) => routes.find((route) => route.id === id);

  function card(route) {
    const { id } = route;
    let at = -1;
    const title = h("strong", {});
    const name = h("input", { type: "text", class: "bw-search be-word", "aria-label": words.route_name, oninput: () => put(id, { name: name.value }) });
    const load = h("input", { type: "number", class: "bw-search be-number be-load", step: "0.05", min: "0", max: "1", "aria-label": words.route_load,
      oninput: () => put(id, { usual_load: load.value === "" ? 0 : Number(load.value) }) });
    const chain = h("ol", { class: "be-chain", "aria-label": words.route_chain });
    const picker = makePicker(words, words.chain_insert, places, (key) => {
      const now = [...routeOf(id).chain];
      const place = at < 0 ? now.length : at + 1;
      now.splice(place, 0, key);
      at = place;
      put(id, { chain: now });
    }, { clear: true, placeholder: words.chain_insert });
    const li = h("li", { class: "be-card be-route" }, h("div", { class: "be-row" }, title, name, h("span", { class: "bw-soft" }, words.route_load), load,
      h("button", { type: "button", class: "be-small be-like", onclick: () => {
        const now = routeOf(id);
        add({ ...now, id: serial + 1, key: freshKey(now.key), name: fill(words.route_like, { name: now.name }) }, routes.indexOf(now));
      } }, words.route_copy),
      h("button", { type: "button", class: "be-off", "aria-label": fill(words.remove, { name: route.name }), onclick: () => {
        routes = routes.filter((each) => each.id !== id);
        show();
        change();
      } }, "×")), chain, picker.node);
    li.change = (now, n) => {
      say(title, fill(words.route, { n: n + 1 }));
      if (name.value !== now.name) name.value = now.name;
      if (Number(load.value) !== now.usual_load || load.value === "") load.value = now.usual_load;
      const segments = new Set((env.catalogue().segment || []).map(([key]) => key));
      keep(chain, now.chain.map((reference, i) => ({ reference, i })), (item) => `${item.i} ${item.reference}`, (item) => h("li", { class: "be-link" },
        h("button", { type: "button", class: "be-link-name", onclick: () => { at = at === item.i ? -1 : item.i; li.change(routeOf(id), routes.indexOf(routeOf(id))); } }),
        h("button", { type: "button", class: "be-off", "aria-label": fill(words.remove, { name: nameOf(item.reference) }), onclick: () => {
          at = -1;
          put(id, { chain: routeOf(id).chain.filter((_, i) => i !== item.i) });
        } }, "×")), (node, item) => {
        say(node.firstChild, nameOf(item.reference));
        mark(node.firstChild, "aria-pressed", at === item.i ? "true" : "false");
        node.classList.toggle("be-link-segment", segments.has(bare(item.reference)));
      });
    };
    return li;
  }
  function show() {
    keep(list, routes, (route) => route.id, card, (li, route) => li.change(route, routes.indexOf(route)));
    const total = routes.reduce((all, route) => all + (route.usual_load || 0), 0);
    say(sum, routes.length ? fill(words.route_sum, { sum: total.toFixed(3).replace(/\.?0+$/, "") }) : "");
    share.hidden = Math.abs(total - 1) < 1e-9 || !routes.length;
  }
  show();
  return {
    node: h("div", {}, h("p", { class: "bw-soft be-hint" }, words.chain_hint), list, h("div", { class: "be-row" }, sum, share,
      h("button", { type: "button", class: "bw-button", onclick: () => add({ key: freshKey("route"), name: fill(words.route, { n: routes.length + 1 }), usual_load: routes.length ? 0.1 : 1, chain: [] }) }, words.route_add))),
    get: () => Object.fromEntries(routes.map(({ key, id, ...route }) => [key, Object.fromEntries(Object.entries(route).filter(([, v]) => v !== null && v !== undefined))])),
    set: (now) => {
      routes = Object.entries(now || {}).map(([key, route]) => {
        serial += 1;
        return { note: null, ...route, key, id: serial };
      });
      show();
    },
  };
}
