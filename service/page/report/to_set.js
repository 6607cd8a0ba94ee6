// What to set: one proposal as a panel, a program or an op-amp card takes it.

import { h, section, symbol, table } from "/page/dom.js";
import { exact, fixed, per, significant } from "/page/format.js";
import { cardParts } from "/page/report/card.js";
import { METHODS, word } from "/page/report/words.js";

const RULES = { backward: "Backward difference", tustin: "Trapezoidal (Tustin)" };

function panel({ forms }, log) {
  const { ideal, series, parallel } = forms;
  const gain = per(log.command_unit, log.speed_unit);
  const rows = [
    ["Ideal (ISA): gain, reset time, rate time", [symbol("Kp"), ` ${significant(ideal.Kp, 5)} ${gain}, `, symbol("Ti"), ` ${significant(ideal.Ti, 5)} s, `, symbol("Td"), ` ${significant(ideal.Td, 5)} s`]],
    ["Series (interacting)", series ? [symbol("Kc"), ` ${significant(series.Kc, 5)} ${gain}, `, symbol("Ti"), ` ${significant(series.tauI, 5)} s, `, symbol("Td"), ` ${significant(series.tauD, 5)} s`] : forms.series_because],
    ["Parallel: three separate gains", [symbol("Kp"), ` ${significant(parallel.Kp, 5)} ${gain}, `, symbol("ki"), ` ${significant(parallel.ki, 5)} (${gain})/s, `, symbol("kd"), ` ${significant(parallel.kd, 5)} (${gain})·s`]],
    ["Resets per minute", significant(forms.resets_per_minute, 5)],
    ["Proportional band", forms.proportional_band_percent === null ? forms.percent_because.replace(/ \(speed_span, command_span\)/, "") : `${significant(forms.proportional_band_percent, 4)} % (gain ${significant(forms.gain_percent, 4)} % per %)`],
    ["Filter and setpoint weight", [symbol("Tf"), ` ${significant(ideal.Tf, 4)} s, `, symbol("b"), ` ${significant(ideal.b, 3)}`]],
  ];
  return [h("h4", {}, "Numbers for a panel"), table("Numbers for a panel", ["The controller asks for", "Set"], rows.map(([name, ...cells]) => [name, h("span", {}, cells)]), { class: "stack told" })];
}

const row = (values) => values.map((value) => significant(value, 8)).join(", ");

function code({ digital, digital_because, continuous }) {
  if (!digital.length) return digital_because && h("p", { class: "note" }, digital_because);
  const rows = digital.map(({ digital: one, margins, Ms_lost, because, rounded }) => [
    RULES[one.rule],
    h("span", { class: "numbers" }, row(one.velocity.num)),
    one.velocity.den.length > 1 ? h("span", { class: "numbers" }, row(one.velocity.den.slice(1))) : "none",
    h("span", { class: "numbers" }, one.setpoint.num.map((value) => significant(value, 6)).join(", ")),
    one.tracking_time === null ? "–" : `${significant(one.tracking_time, 4)} s`,
    margins ? (margins.stable ? `${fixed(margins.Ms, 3)} (${Ms_lost >= 0 ? "+" : ""}${fixed(Ms_lost, 3)})` : h("strong", { class: "verdict poor" }, "▲ unstable")) : because,
    ...(rounded ? [[rounded.coefficients.words, rounded.coefficients.integral_step].flat().map(({ name, integer, shift }) => `${name} = ${integer} / 2^${shift}`).join(", ") + (rounded.Ms_lost === null ? "" : `; costs ${fixed(rounded.Ms_lost, 4)} of Ms`)] : []),
  ]);
  const every = digital[0].digital.h;
  const words = digital.some(({ rounded }) => rounded);
  return [h("h4", {}, "Coefficients for a program"),
    h("p", { class: "note" }, `Every ${exact(every)} s add to the command: the errors e[k], e[k−1], … times the numbers under “On the errors”, less its own last moves times those under “On past moves”; e = setpoint − speed. Without sampling Ms would be ${fixed(continuous?.Ms, 3)}; the last figure is of the loop as it is sampled, hold and computing delay included.`),
    table("Coefficients for a program", ["Rule", "On the errors", "On past moves", "From the setpoint alone", ["Anti-windup time ", symbol("Tt")], [symbol("Ms"), " (lost to sampling)"], ...(words ? ["In whole numbers"] : [])], rows, { class: "stack code" }),
    digital.some(({ digital: one }) => one.b !== 1) && h("p", { class: "note" }, `The setpoint weight is ${significant(digital[0].digital.b, 3)}, not 1: let those numbers act on minus the speed instead of the error, reckon a second move from the last two setpoints with the numbers under “From the setpoint alone”, and add both.`),
    h("p", { class: "note" }, digital[0].digital.bumpless)];
}

/** One proposal's realisations; log: for the units. */
export function realised(made, log) {
  return [panel(made, log), made.card ? cardParts(made.card, log) : code(made)].flat();
}

export function toSet(report) {
  const shown = report.tunings.map((tuning, i) => ({ ...tuning, best: i === report.recommended }))
    .filter(({ realisations }) => realisations?.forms)
    .sort((a, b) => b.best - a.best);
  if (!shown.length) return null;
  return section("to-set", "What to set", "The same settings in the numbers that different controllers ask for. Check which form yours uses before you type anything.",
    shown.map(({ method, best, realisations }) => h("details", { class: "carried", open: best, "data-testid": `to-set-${method}` },
      h("summary", {}, word(METHODS, method), best && [" ", h("span", { class: "badge" }, "recommended")]),
      realised(realisations, report.log))));
}
