// Markdown reaches the page only as the HTML that the kernel has made safe, and of that only known tags without any
// attribute are rebuilt, node by node: a second lock on the same door.
import { h } from "../front/kit.js";

const TAGS = new Set(["P", "EM", "STRONG", "UL", "OL", "LI", "CODE", "PRE", "BLOCKQUOTE", "BR", "HR", "TABLE", "THEAD", "TBODY", "TR",
  "TH", "TD", "H1", "H2", "H3", "H4"]);

function rebuilt(node) {
  if (node.nodeType === Node.TEXT_NODE) return document.createTextNode(node.textContent);
  if (node.nodeType !== Node.ELEMENT_NODE) return null;
  const children = [...node.childNodes].map(rebuilt);
  return TAGS.has(node.tagName) ? h(node.tagName.toLowerCase(), {}, children) : h("span", {}, children);
}

/** A node with a note's text; `html` is what the kernel sanitised. */
export function prose(html) {
  const parsed = new DOMParser().parseFromString(html, "text/html"); // an inert document: nothing in it loads or runs
  return h("div", { class: "bw-prose" }, [...parsed.body.childNodes].map(rebuilt));
}
