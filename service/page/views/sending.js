// Many logs on their way to a loop, each with how it went.

import { h } from "/page/dom.js";
import { reportAddress } from "/page/views/addresses.js";

/** {node, begin(i), tell(i, analysis), refuse(i, error), finish(href, onDone)} */
export function sending(loop, names, onStop) {
  const told = names.map(() => h("span", { class: "note" }, "waits"));
  const bar = h("progress", { max: names.length, value: 0, "aria-label": "Logs sent" });
  const stop = h("button", { class: "button quiet", type: "button", onclick: onStop }, "Stop after this one");
  const way = h("p", { class: "actions" }, stop);
  const say = (i, ...content) => told[i].replaceChildren(...content);
  const node = h("section", { class: "sheet", "data-testid": "sending" },
    h("p", { class: "eyebrow" }, `For the loop ${loop}`), h("h1", {}, `${names.length} logs`), bar,
    h("ol", { class: "sending" }, names.map((name, i) => h("li", {}, h("span", {}, name), " ", told[i]))), way);
  return {
    node,
    begin: (i) => say(i, "sent, being analysed"),
    tell(i, { status, report_id, problem }) {
      bar.value = i + 1;
      if (report_id) say(i, h("a", { href: reportAddress(report_id) }, "report"));
      else say(i, status === "failed" ? `no report: ${problem?.detail ?? ""}` : "kept; its analysis goes on");
    },
    refuse(i, error) {
      bar.value = i + 1;
      say(i, `not kept: ${error.message}`);
    },
    finish: (href, onDone) => way.replaceChildren(h("a", { class: "button", href, "data-testid": "sent", onclick: (event) => { event.preventDefault(); onDone(); } }, `To ${loop}`)),
  };
}
