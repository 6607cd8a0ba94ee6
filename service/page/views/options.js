// The options of an analysis: the query's own keys, folded away until someone needs them.

import { h } from "/page/dom.js";

const DATE_ORDERS = [["", "as the stamps show"], ["dmy", "day, month, year"], ["mdy", "month, day, year"], ["ymd", "year, month, day"]];
const ROLES = [["time", "Time"], ["setpoint", "Setpoint"], ["command", "Command"], ["speed", "Measured speed"]];

function field(name, label, hint, input, choices = null) {
  const attributes = { id: `option-${name}`, name, ...input, ...(hint && { "aria-describedby": `hint-${name}` }) };
  return h("div", { class: "field" },
    h("label", { for: `option-${name}` }, label),
    choices
      ? h("select", attributes, choices.map(([value, text]) => h("option", { value, selected: value === (input.value ?? "") }, text)))
      : h("input", { autocomplete: "off", spellcheck: "false", ...attributes }),
    hint && h("p", { class: "hint", id: `hint-${name}` }, hint));
}

/** The fields, preset from `given` (query keys to values). */
export function optionFields(given = {}) {
  return h("div", { class: "options" },
    field("Ms", "Target Ms", "The largest peak of the sensitivity you accept. 1.4 is cautious, 1.6 usual, 2.0 brisk.",
      { type: "number", min: "1.01", max: "10", step: "any", placeholder: "1.6", value: given.Ms ?? "" }),
    field("period", "Controller period, s", "How often the controller computes. Empty: the log's sample time; 0: an analogue controller.",
      { type: "number", min: "0", step: "any", placeholder: "as the log", value: given.period ?? "" }),
    field("zone", "Time zone of the stamps", "Only for stamps without an offset, for example Europe/Vienna.",
      { type: "text", placeholder: "from the log", value: given.zone ?? "" }),
    field("date_order", "Order of the dates", "Where the stamps leave it open, as 3/2/2026 does.", { value: given.date_order }, DATE_ORDERS),
    h("fieldset", {},
      h("legend", {}, "Column names, where the header does not say; without a header, positions: 0, 1, 2"),
      h("div", { class: "roles" }, ROLES.map(([name, label]) =>
        field(name, label, null, { type: "text", placeholder: "found by itself", value: given[name] ?? "" })))));
}

/** What a form with these fields says: query keys to texts, empty ones left out. */
export function options(form) {
  return Object.fromEntries([...new FormData(form)]
    .filter(([name, value]) => typeof value === "string" && value.trim() !== "" && name !== "log")
    .map(([name, value]) => [name, value.trim()]));
}

/** A folded form that analyses the same log again. */
export function againForm(given, onAgain, attributes = {}) {
  return h("details", { class: "fold", ...attributes },
    h("summary", {}, "Change the options and analyse this log again"),
    h("form", { "data-testid": "again", onsubmit: (event) => { event.preventDefault(); onAgain(event.target); } },
      optionFields(given), h("button", { class: "button", type: "submit" }, "Analyse again")));
}
