// What the lines mean: a sample of each line beside its name, so that dash and weight tell them apart too.

import { h, s } from "/page/dom.js";

/** items: [{name, mark}], mark being the class of the line or "dot". */
export function legend(items) {
  return h("ul", { class: "legend" }, items.map(({ name, mark }) =>
    h("li", {},
      s("svg", { viewBox: "0 0 30 10", width: 30, height: 10, "aria-hidden": "true" },
        mark === "dot" ? s("circle", { class: "mark", cx: 15, cy: 5, r: 4 }) : s("line", { class: mark, x1: 1, x2: 29, y1: 5, y2: 5 })),
      name)));
}
