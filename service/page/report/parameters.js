// The parameters with their uncertainty, and how sharply the log fixes the dead time.

import { dataTable } from "/page/charts/data_table.js";
import { responsive } from "/page/charts/plot.js";
import { profile as profileChart } from "/page/charts/small.js";
import { h, section, symbol, table } from "/page/dom.js";
import { estimate, interval } from "/page/format.js";
import { MODELS, PARAMETERS, word } from "/page/report/words.js";

function row(name, one, label) {
  const shown = estimate(one);
  return [[label ?? symbol(name), " ", h("span", { class: "gloss" }, word(PARAMETERS, name))],
    h("data", { value: one.value, "data-testid": `parameter-${name}` }, shown.value), shown.std, interval(shown), one.unit];
}

function rows(fit) {
  const derived = Object.entries(fit.derived).map(([name, one]) =>
    row(name, one, name.includes("/") ? name.split("/").flatMap((part, i) => (i ? ["/", symbol(part)] : [symbol(part)])) : null));
  const friction = fit.friction ? [["Dry friction, forward", fit.friction.forward], ["Dry friction, backward", fit.friction.backward]]
    .map(([label, one]) => { const shown = estimate(one); return [label, shown.value, shown.std, interval(shown), one.unit]; }) : [];
  return [...Object.entries(fit.parameters).map(([name, one]) => row(name, one)), ...derived, ...friction];
}

export function parameters(report) {
  if (report.selected === null) return null;
  const fit = report.fits[report.selected];
  const head = ["Parameter", "Value", "Standard deviation", "95 % interval", "Unit"];
  const others = report.fits.filter((one) => one !== fit);
  return section("parameters", "Parameters", "How well this one log fixes each number. The interval holds for the noise in the log, not for a machine that changes.",
    table(`Parameters of the ${word(MODELS, fit.model).toLowerCase()}`, head, rows(fit), { class: "stack", "data-testid": "parameters" }),
    others.map((one) => h("details", { class: "fold small" }, h("summary", {}, `Not selected: ${word(MODELS, one.model).toLowerCase()}`),
      table(`Parameters of the ${word(MODELS, one.model).toLowerCase()}`, head, rows(one), { class: "stack" }))));
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
