// The parameters with their uncertainty, and how sharply the log fixes the dead time.

import { dataTable } from "/page/charts/data_table.js";
import { responsive } from "/page/charts/plot.js";
import { profile as profileChart } from "/page/charts/small.js";
import { expression, h, section, table } from "/page/dom.js";
import { estimate, interval } from "/page/format.js";
import { formula, MODELS, PARAMETERS, RINGING, word } from "/page/report/words.js";

const HEAD = ["Parameter", "Value", "Standard deviation", "95 % interval", "Unit"];

function row(hook, name, one, label = expression(name), gloss = word(PARAMETERS, name)) {
  const shown = estimate(one);
  return [[label, " ", h("span", { class: "gloss" }, gloss === name ? "" : gloss)],
    h("data", { value: one.value, "data-testid": hook && `${hook}-${name}` }, shown.value), shown.std, interval(shown), one.unit === "1" ? "–" : one.unit];
}

function derived(fit, hook) {
  return Object.entries(fit.derived).map(([name, one]) => {
    const [label, gloss] = ("zeta" in fit.parameters && RINGING[name]) || [name];
    return row(hook, name, one, expression(label), gloss);
  });
}

function rows(fit, hook) {
  const friction = fit.friction ? [["Dry friction, forward", fit.friction.forward], ["Dry friction, backward", fit.friction.backward]]
    .map(([label, one]) => { const shown = estimate(one); return [label, shown.value, shown.std, interval(shown), one.unit]; }) : [];
  return [...Object.entries(fit.parameters).map(([name, one]) => row(hook, name, one)), ...derived(fit, hook), ...friction];
}

/** The parameters of one fit, under its formula; hook: how tests find its numbers. */
export function parameterTable(fit, hook = null) {
  const written = formula(fit);
  return [written && h("p", { class: "formula" }, expression(written)),
    table(`Parameters of the ${word(MODELS, fit.model).toLowerCase()}`, HEAD, rows(fit, hook), { class: "stack", "data-testid": hook && `${hook}s` })];
}

export function parameters(report) {
  if (report.selected === null) return null;
  const fit = report.fits[report.selected];
  return section("parameters", "Parameters", "How well this one log fixes each number. The interval holds for the noise in the log, not for a machine that changes.",
    parameterTable(fit, "parameter"));
}

export function profile(report) {
  const curve = report.curves.profile;
  if (report.selected === null || !curve) return null;
  const one = report.fits[report.selected].parameters[curve.parameter];
  const shown = one && estimate(one);
  const said = shown ? `Least at ${shown.value} ${one.unit}; 95 % interval ${interval(shown)}.` : "The lowest point is the best value.";
  const name = curve.parameter === "L" ? "Dead-time profile" : `Profile along ${curve.parameter}`;
  return section("profile", name, "How much worse the fit gets with this parameter held elsewhere and the others fitted anew. A narrow valley is a well-known number.",
    h("p", { class: "note" }, said, " The band is the interval, the dashed line the estimate, the dotted line the ratio that bounds the interval."),
    responsive((width) => profileChart(width, curve, one, said)),
    dataTable(name, [[`${curve.parameter}, ${curve.unit}`, curve.value], ["Ratio", curve.ratio]]));
}
