// The options of an analysis: the query's own keys, folded away until someone needs them.

import { h } from "/page/dom.js";
import { FORMS, GOALS } from "/page/report/words.js";
import { field, given } from "/page/views/fields.js";

const DATE_ORDERS = [["", "as the stamps show"], ["dmy", "day, month, year"], ["mdy", "month, day, year"], ["ymd", "year, month, day"]];
const ROLES = [["time", "Time"], ["setpoint", "Setpoint"], ["command", "Command"], ["speed", "Measured speed"]];

/** What the fields of reading say: query keys. */
export const READING = ["zone", "date_order", ...ROLES.map(([name]) => name)];

/** The fields, preset (query keys to values). */
export function optionFields(preset = {}) {
  return h("div", { class: "options" },
    field("Ms", "Target Ms", "The largest peak of the sensitivity you accept. 1.4 is cautious, 1.6 usual, 2.0 brisk.",
      { type: "number", min: "1.01", max: "5", step: "any", placeholder: "1.6", value: preset.Ms ?? "" }),
    field("form", "Controller", null, { value: preset.form ?? "" }, [["", "PI, or as the loop has it"], ...Object.entries(FORMS)]),
    field("goal", "Aim", null, { value: preset.goal ?? "" }, [["", "Largest integral gain, or as the loop has it"], ...Object.entries(GOALS)]),
    field("period", "Controller period, s", "How often the controller computes. Empty: as the log shows it, else its sample time; 0: an analogue controller.",
      { type: "number", min: "0", step: "any", placeholder: "as the log", value: preset.period ?? "" }),
    reading(preset));
}

/** Of them those that say how a log is read. */
export const readingFields = (preset = {}) => h("div", { class: "options" }, reading(preset));

function reading(preset) {
  return [
    field("zone", "Time zone of the stamps", "Only for stamps without an offset, for example Europe/Vienna.",
      { type: "text", placeholder: "from the log", value: preset.zone ?? "" }),
    field("date_order", "Order of the dates", "Where the stamps leave it open, as 3/2/2026 does.", { value: preset.date_order }, DATE_ORDERS),
    h("fieldset", {},
      h("legend", {}, "Column names, where the header does not say; without a header, positions: 0, 1, 2"),
      h("div", { class: "roles" }, ROLES.map(([name, label]) =>
        field(name, label, null, { type: "text", placeholder: "found by itself", value: preset[name] ?? "" })))),
  ];
}

/** What a form with these fields says: query keys to texts. */
export const options = given;

/** A folded form that analyses the same log again. */
export function againForm(preset, onAgain, attributes = {}) {
  return h("details", { class: "fold", ...attributes },
    h("summary", {}, "Change the options and analyse this log again"),
    h("form", { "data-testid": "again", onsubmit: (event) => { event.preventDefault(); onAgain(event.target); } },
      optionFields(preset), h("button", { class: "button", type: "submit" }, "Analyse again")));
}
