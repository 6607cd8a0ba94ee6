// The loops, a page of them, each with the verdict on its last log.

import { h, table } from "/page/dom.js";
import { exact } from "/page/format.js";
import { loopAddress } from "/page/views/addresses.js";
import { day, lastNews, verdictMark } from "/page/views/verdict.js";

function opening(onOpen) {
  const name = h("input", { id: "new-loop", name: "loop", required: true, maxlength: 100, autocomplete: "off", spellcheck: "false", placeholder: "drum 3" });
  return h("form", { class: "open-loop", onsubmit: (event) => { event.preventDefault(); if (name.value.trim()) onOpen(name.value.trim()); } },
    h("div", { class: "field" }, h("label", { for: "new-loop" }, "A new loop"), name),
    h("button", { class: "button quiet", type: "submit" }, "Set it up"));
}

function installed(one) {
  return one ? `Kp ${exact(one.Kp)}, Ti ${exact(one.Ti)} s` : "not told";
}

/** What stands where the last log has no news. */
function before(drift) {
  const last = drift.verdict === "no-news" && lastNews(drift);
  return last ? h("span", {}, "; before: ", verdictMark({ ...last, as_of: last.at }), ` ${day(last.at)}`) : "";
}

/** {node, tell(loop, drift), unknown(loop, error)}; after, next: where this page and the next begin. */
export function loopList(loops, { after, next, onOpen }) {
  const cells = new Map(loops.map((one) => [one.loop, h("span", { class: "note", "data-testid": "loop-verdict" },
    one.baseline.length ? "looking …" : one.logs ? "no baseline chosen" : "no logs yet")]));
  const rows = loops.map((one) => [h("a", { href: loopAddress(one.loop) }, one.loop), cells.get(one.loop), String(one.logs), String(one.baseline.length || "none"), installed(one.installed)]);
  const node = h("section", { class: "sheet", "data-testid": "loops" },
    h("h1", {}, "Loops"),
    loops.length || after ? table("The loops", ["Loop", "Verdict on its last log", "Logs", "Nights in its baseline", "Installed settings"], rows, { class: "stack loops" })
      : h("div", { class: "opening", "data-testid": "no-loops" },
        h("p", { class: "lead" }, "There are no loops yet. A loop is one motor with its controller; its logs are kept, night after night, so that a change shows."),
        h("p", {}, "It begins with its first log: ", h("a", { href: "#/" }, "bring one"), " and name the loop. Or set it up here first, with the settings that are in the machine.")),
    h("p", { class: "actions paging" }, after && h("a", { class: "button quiet", href: "#/loops" }, "First page"),
      next && h("a", { class: "button quiet", rel: "next", href: `#/loops?${new URLSearchParams({ after: next })}` }, "Next page")),
    opening(onOpen));
  return {
    node,
    tell(loop, drift) {
      cells.get(loop).replaceChildren(...(drift === null ? ["no baseline chosen"] : [verdictMark(drift), drift.as_of ? ` ${day(drift.as_of)}` : "", before(drift)]));
    },
    unknown(loop, error) {
      cells.get(loop).replaceChildren(`not known: ${error.message}`);
    },
  };
}
