// What is known of a loop, so that its logs need not repeat it.

import { h } from "/page/dom.js";
import { FORMS, GOALS } from "/page/report/words.js";
import { loopAddress } from "/page/views/addresses.js";
import { field, given, refuse } from "/page/views/fields.js";

const DATE_ORDERS = [["", "as the stamps show"], ["dmy", "day, month, year"], ["mdy", "month, day, year"], ["ymd", "year, month, day"]];
const MODELS = [["auto", "chosen by the log"], ["fopdt", "first-order lag with dead time"], ["sopdt", "second-order lag with dead time"], ["arx", "difference equation"]];
const TEXTS = new Set(["units.speed", "units.command", "columns.time", "columns.setpoint", "columns.command", "columns.speed", "zone", "date_order", "defaults.model", "defaults.form", "defaults.goal"]);

/** "installed.Kp" of {installed: {Kp}}, or nothing. */
const at = (settings, path) => path.split(".").reduce((part, name) => part?.[name], settings) ?? "";

/** Texts by path to the settings that the service takes. */
function nested(texts) {
  const settings = {};
  for (const [path, text] of Object.entries(texts)) {
    const names = path.split(".");
    const last = names.pop();
    let part = settings;
    for (const name of names) part = part[name] ??= {};
    part[last] = TEXTS.has(path) ? text : Number(text);
  }
  return settings;
}

export function loopSettings(name, known, { onSave }) {
  const text = (path, label, hint, placeholder) => field(path, label, hint, { type: "text", placeholder, value: at(known, path) });
  const number = (path, label, hint, more = {}) => field(path, label, hint, { type: "number", step: "any", value: at(known, path), ...more });
  const choice = (path, label, hint, choices) => field(path, label, hint, { value: at(known, path) }, choices);
  const group = (title, note, ...fields) => h("fieldset", { class: "group" }, title && h("legend", {}, title), note && h("p", { class: "hint" }, note), h("div", { class: "roles" }, fields));
  const problem = h("p", { class: "notice", role: "alert", hidden: true, "data-testid": "settings-problem" });
  const form = h("form", { "data-testid": "settings", onsubmit: async (event) => {
    event.preventDefault();
    problem.hidden = true;
    refuse(form, {});
    try {
      await onSave(nested(given(form)));
    } catch (error) {
      if (error.name === "AbortError") return;
      problem.textContent = error.message;
      problem.hidden = false;
      refuse(form, error.evidence ?? {});
    }
  } },
  group("Installed settings", "What is in the machine now, in the ideal form. Margins are followed for these. Leave all empty if they are not known: then for those that the logs show, where they do.",
    number("installed.Kp", "Gain Kp", "Command unit per speed unit."), number("installed.Ti", "Integral time Ti, s"), number("installed.Td", "Derivative time Td, s", "Empty: 0, a PI controller.", { min: 0 }),
    number("installed.Tf", "Filter time Tf, s", "Empty: 0.", { min: 0 }), number("installed.b", "Setpoint weight b", "Empty: 1.")),
  group("Controller", null,
    number("period", "Period, s", "How often it computes. Empty: as each log shows it, else its sample time; 0: an analogue one.", { min: 0 }),
    number("command_limits.low", "Lowest command", "In the command’s unit."), number("command_limits.high", "Highest command", "Both or neither.")),
  group("The logs", "Where a header says otherwise, the header holds.",
    text("units.speed", "Unit of speed", null, "rpm"), text("units.command", "Unit of command", null, "%"),
    text("zone", "Time zone of the stamps", "Only for stamps without an offset.", "Europe/Vienna"),
    choice("date_order", "Order of the dates", null, DATE_ORDERS), number("counts_per_rev", "Counts per revolution", "Where the speed column counts an encoder.", { min: 0 })),
  group("Column names, where the header does not say; without a header, positions: 0, 1, 2", null,
    text("columns.time", "Time", null, "found by itself"), text("columns.setpoint", "Setpoint", null, "found by itself"), text("columns.command", "Command", null, "found by itself"), text("columns.speed", "Measured speed", null, "found by itself")),
  group("What to ask of each log", null,
    number("defaults.Ms", "Target Ms", "1.4 is cautious, 1.6 usual, 2.0 brisk.", { min: 1.01, max: 5, placeholder: "1.6" }),
    choice("defaults.model", "Model", null, MODELS), choice("defaults.form", "Controller form", null, Object.entries(FORMS)), choice("defaults.goal", "Aim", null, Object.entries(GOALS))),
  h("details", { class: "fold" }, h("summary", {}, "When a move counts"),
    group("", "A loop has moved when the change exceeds chance and also these fractions of the baseline’s values.",
      number("watch.significance", "False alarms per unchanged night", null, { placeholder: "0.0027" }),
      number("watch.practical.K", "Least change of K", null, { placeholder: "0.1" }), number("watch.practical.T", "Least change of T", null, { placeholder: "0.15" }),
      number("watch.practical.K_per_T", "Least change of K/T", null, { placeholder: "0.15" }), number("watch.practical.L", "Least change of L", null, { placeholder: "0.2" }),
      number("watch.practical.L_of_sum", "Least change of L, of T + L", "The larger of the two counts.", { placeholder: "0.05" }))),
  problem,
  h("p", { class: "after" }, h("button", { class: "button", type: "submit" }, known ? "Save the settings" : "Make the loop"),
    known && h("a", { class: "button quiet", href: loopAddress(name) }, "Leave them as they are")));
  return h("section", { class: "sheet" }, h("p", { class: "eyebrow" }, known ? h("a", { href: loopAddress(name) }, name) : "A new loop"),
    h("h1", {}, known ? "Settings of the loop" : name),
    h("p", { class: "lead" }, "Later logs are read with these. Reports that exist stay as they are; margins and verdicts are reckoned with the settings as they stand."), form);
}
