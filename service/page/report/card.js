// An op-amp card: its parts and what they make, and a form for the parts of a card as found.

import { h, section, symbol, table } from "/page/dom.js";
import { fixed, per, significant } from "/page/format.js";
import { marginCells } from "/page/report/tunings.js";
import { field, given } from "/page/views/fields.js";

const PARTS = {
  R1: "Input resistor", Rd: "Damping resistor, in series with C1", C1: "Differentiating capacitor", R2: "Feedback resistor",
  C2: "Integrating capacitor", Rl: "Leak resistor", Ra: "Error amplifier, input resistors", Rb: "Error amplifier, feedback resistors",
};
const CORNERS = { integrating: "Integrating", differentiating: "Differentiating", filter: "Filter", leak: "Leak" };
const SERIES = ["E3", "E6", "E12", "E24", "E48", "E96", "E192"].map((name) => [name, name]);
const LEAKS = [["none", "none"], ["C2", "across C2"], ["both", "across R2 and C2"]];

const trade = (value, unit) => {
  const power = Math.floor(Math.log10(value) / 3 + 1e-9);
  const prefix = { "-4": "p", "-3": "n", "-2": "µ", "-1": "m", 0: "", 1: "k", 2: "M" }[power];
  return prefix === undefined ? `${value} ${unit}` : `${Number((value / 1000 ** power).toPrecision(4))} ${prefix}${unit}`;
};

/** Everything about one card. */
export function cardParts(card, log) {
  const { spread, change, settings } = card;
  const gain = per(log.command_unit, log.speed_unit);
  const figures = [
    ["As a controller (ideal form)", [symbol("Kp"), ` ${significant(settings.Kp, 4)} ${gain}, `, symbol("Ti"), ` ${significant(settings.Ti, 4)} s, `, symbol("Td"), ` ${significant(settings.Td, 4)} s`]],
    ["Corner frequencies", Object.entries(card.corners_hz).map(([name, hz]) => `${CORNERS[name]} ${significant(hz, 3)} Hz`).join(", ")],
    ["Gain at standstill, at high frequencies", `${card.low_gain === null ? "integrates without end" : `${significant(card.low_gain, 3)} V/V`}, ${significant(card.high_gain, 3)} V/V`],
    spread && ["Worst case of the parts' tolerances", [spread.stable ? [symbol("Ms"), ` ${fixed(spread.Ms_worst, 3)}. `] : h("strong", { class: "verdict poor" }, "▲ unstable. "), h("span", { class: "note" }, `Tried: ${spread.method}.`)]],
    ["Sign", card.inversions],
    change && ["Change to reach the target", [Object.keys(change.change).length ? h("strong", {}, Object.entries(change.change).map(([name, value]) => `${name}: ${trade(value, name.startsWith("C") ? "F" : "Ω")}`).join(", "), ". ") : null, change.margins && Object.keys(change.change).length ? [symbol("Ms"), ` becomes ${fixed(change.margins.Ms, 3)}. `] : null, change.because]],
  ].filter(Boolean);
  return [h("h4", {}, "Parts of an op-amp card"),
    table("Parts", ["Part", "Value", "What it is"], Object.entries(card.printed).map(([name, value]) => [symbol(name), h("strong", {}, value), PARTS[name]]), { class: "stack", "data-testid": "card-parts" }),
    table("Margins of the card", ["Margins", symbol("Ms"), symbol("Mt"), "Gain margin", "Phase margin", "Delay margin"], [["With these parts", ...marginCells(card.margins)]], { class: "stack" }),
    table("The card in figures", ["Figure", "Value"], figures.map(([name, ...cells]) => [name, h("span", {}, cells)]), { class: "stack told" }),
    h("ul", { class: "notes" }, card.cautions.map((one) => h("li", {}, one)))];
}

const number = (name, label, value = "", extra = {}) => field(name, label, null, { type: "number", min: "0", step: "any", value, id: `card-${name}`, ...extra });

/** Fields that say what a card is on. */
export const scaleFields = (preset = {}, where = "card") => [
  number("speed_volts", "V on the card per unit of speed", preset.speed_volts ?? "", { placeholder: "1", id: `${where}-speed_volts` }), number("command_volts", "V on the card per unit of command", preset.command_volts ?? "", { placeholder: "1", id: `${where}-command_volts` }),
  field("R_series", "Resistor series", null, { value: preset.R_series ?? "E24", id: `${where}-R_series` }, SERIES), field("C_series", "Capacitor series", null, { value: preset.C_series ?? "E6", id: `${where}-C_series` }, SERIES),
];

const numbers = (texts, names) => Object.fromEntries(names.filter((name) => name in texts).map((name) => [name, Number(texts[name])]));

/** What those fields say, as the service takes it. */
export const scaleOf = (texts) => ({ ...numbers(texts, ["speed_volts", "command_volts"]), R_series: texts.R_series, C_series: texts.C_series });

/** The form for a card as found; judge(body) -> card. */
export function cardForm(report, judge) {
  const output = h("div", { "aria-live": "polite", "data-testid": "judged" });
  const kilo = (name) => number(name, `${name}, kΩ`);
  const form = h("form", { class: "options", "data-testid": "card-form", onsubmit: (event) => { event.preventDefault(); send(); } },
    number("R1", "R1, kΩ", "", { required: true }), number("R2", "R2, kΩ", "", { required: true }), number("C2", "C2, nF", "", { required: true }),
    kilo("Rd"), number("C1", "C1, nF"), kilo("Ra"), kilo("Rb"), field("leak", "Leak resistor", null, { value: "none", id: "card-leak" }, LEAKS), kilo("Rl"),
    number("Ms", "Target Ms", report.options.Ms, { min: "1.01", max: "5" }), scaleFields(),
    h("div", { class: "submit" }, h("button", { class: "button", type: "submit" }, "Judge the card")));

  async function send() {
    const texts = given(form);
    const parts = { leak: texts.leak };
    for (const name of Object.keys(PARTS)) if (name in texts) parts[name] = Number(`${texts[name]}${name.startsWith("C") ? "e-9" : "e3"}`);
    try {
      const card = await judge({ parts, ...numbers(texts, ["Ms"]), ...scaleOf(texts) });
      output.replaceChildren(...cardParts(card, report.log));
    } catch (error) {
      if (error.name !== "AbortError") output.replaceChildren(h("p", { class: "notice", role: "alert" }, error.message));
    }
  }

  return section("card", "An op-amp card as found", "Read the parts off the card: input R1 beside Rd and C1, feedback R2 and C2, error amplifier Ra and Rb. Leave Rd and C1 empty on a PI card.",
    h("details", { class: "carried" }, h("summary", {}, "Judge a card by its parts"), form), output);
}
