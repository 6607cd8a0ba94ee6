// Elements from data. Text always becomes a text node, so nothing in a log or an error can be markup.

const SVG = "http://www.w3.org/2000/svg";

function fill(node, attributes, children) {
  for (const [name, value] of Object.entries(attributes ?? {})) {
    if (value === null || value === undefined || value === false) continue;
    if (name.startsWith("on")) node.addEventListener(name.slice(2), value);
    else node.setAttribute(name, value === true ? "" : String(value));
  }
  node.append(...children.flat(Infinity).filter((child) => child !== null && child !== undefined && child !== false));
  return node;
}

/** An HTML element: h("p", {class: "note", onclick: f}, "text", child, [more], null). */
export function h(tag, attributes, ...children) {
  return fill(document.createElement(tag), attributes, children);
}

/** The same in SVG. */
export function s(tag, attributes, ...children) {
  return fill(document.createElementNS(SVG, tag), attributes, children);
}

const GREEK = { zeta: "ζ", w0: "ω0" };
const STANDING = new Set(["exp"]);

/** A symbol of the trade with its index set low: "Kp" becomes K with subscript p. */
export function symbol(name) {
  const match = /^(.)_?([A-Za-z0-9]+)$/.exec(GREEK[name] ?? name);
  return match ? h("var", {}, match[1], h("sub", {}, match[2])) : h("var", {}, GREEK[name] ?? name);
}

/** A formula with its symbols set as symbols: "K/(T1 + T2)". */
export function expression(text) {
  return text.split(/([A-Za-z][A-Za-z0-9_]*)/).map((part, i) => (i % 2 && !STANDING.has(part) ? symbol(part) : part));
}

/**
 * A table with a caption; rows are arrays of cells, the first of each row its header.
 * Each cell carries its column's name, which narrow screens show before it.
 */
export function table(caption, head, rows, attributes = {}) {
  const heads = head.map((cell) => h("th", { scope: "col" }, cell));
  return h("div", { class: "table-frame", role: "region", "aria-label": caption, tabindex: "0" },
    h("table", attributes,
      h("caption", { class: "unseen" }, caption),
      h("thead", {}, h("tr", {}, heads)),
      h("tbody", {}, rows.map((row) =>
        h("tr", row.attributes ?? {}, (row.cells ?? row).map((cell, i) =>
          i === 0 ? h("th", { scope: "row" }, cell) : h("td", { "data-column": heads[i].textContent }, cell)))))));
}

/** One titled part of the report: heading and a line of explanation beside or above its content. */
export function section(id, title, note, ...content) {
  return h("section", { class: "part", id, "aria-labelledby": `${id}-title`, "data-testid": `part-${id}` },
    h("header", {}, h("h2", { id: `${id}-title` }, title), note && h("p", { class: "note" }, note)),
    h("div", { class: "content" }, content));
}
