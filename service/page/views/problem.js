// A refusal: the service's sentence, its code, and the way on.

import { h } from "/page/dom.js";
import { againForm } from "/page/views/options.js";

export function problem(error, current, { onAgain }) {
  return h("section", { class: "sheet", role: "alert", "data-testid": "problem" },
    h("p", { class: "eyebrow" }, current ? current.name : "Not done"),
    h("h1", {}, "This log gave no report"),
    h("p", { class: "lead", "data-testid": "problem-message" }, error.message),
    h("p", { class: "note" }, "Code ", h("code", { "data-testid": "problem-code" }, error.code),
      error.status && ` (HTTP ${error.status})`),
    h("p", {}, h("a", { class: "button", href: "#/" }, "Bring another log")),
    current && againForm(current.options, onAgain));
}
