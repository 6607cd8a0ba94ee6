// A refusal: the service's sentence, its code, and the way on.

import { h } from "/page/dom.js";
import { loopAddress, settingsAddress } from "/page/views/addresses.js";
import { againForm } from "/page/views/options.js";

/** name: of the log; loop: whose log it is; onAgain with options: the same log can be tried otherwise. */
export function problem(error, { name = "Not done", title = "This log gave no report", advice, loop, options, onAgain } = {}) {
  return h("section", { class: "sheet", role: "alert", "data-testid": "problem" },
    h("p", { class: "eyebrow" }, name),
    h("h1", {}, title),
    h("p", { class: "lead", "data-testid": "problem-message" }, error.message),
    h("p", { class: "note" }, "Code ", h("code", { "data-testid": "problem-code" }, error.code),
      error.status && ` (HTTP ${error.status})`),
    advice && h("p", { class: "note" }, advice),
    h("p", { class: "actions" },
      loop && [h("a", { class: "button", href: loopAddress(loop) }, `To ${loop}`), h("a", { class: "button quiet", href: settingsAddress(loop) }, "Settings of the loop")],
      h("a", { class: loop ? "button quiet" : "button", href: "#/" }, "Bring another log")),
    onAgain && againForm(options, onAgain));
}
