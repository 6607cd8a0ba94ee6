// How well the model describes the log, each figure with what it means.

import { h, section, table } from "/page/dom.js";
import { fixed, probability, significant, withUnit } from "/page/format.js";

const LEVEL = 0.05;

function verdict(p, good, bad) {
  if (p === null || p === undefined) return null;
  return h("span", { class: p < LEVEL ? "verdict poor" : "verdict fine" }, p < LEVEL ? `▲ ${bad}` : `✓ ${good}`);
}

export function statistics(report) {
  if (report.selected === null) return null;
  const one = report.fits[report.selected].statistics;
  const peak = one.max_autocorrelation === null ? null : `${fixed(one.max_autocorrelation, 3)} at lag ${one.max_autocorrelation_lag}`;
  const rows = [
    ["Fit", withUnit(fixed(one.fit_percent, 2), "%"), "NRMSE of the simulated response: 100 % is perfect, 0 % no better than the mean speed.", null, "fit_percent", one.fit_percent],
    ["Fit on a held-out span", withUnit(fixed(one.validation_fit_percent, 2), "%"), one.validation_fit_percent === null ? "No span that moves could be held out." : "The same on rows that the model was not fitted to. Close to the fit is good.", null, "validation", one.validation_fit_percent],
    ["Root mean square of the residuals", withUnit(significant(one.rms_residual, 3), report.log.speed_unit), "Typical distance of the measured speed from the fitted response.", null, "rms", one.rms_residual],
    ["Whiteness, p", probability(one.whiteness_p), "Ljung-Box test of the residuals against white noise.", verdict(one.whiteness_p, "no pattern seen", "a pattern is left"), "whiteness", one.whiteness_p],
    ["Largest autocorrelation", peak ?? "–", "Of the residuals with themselves, some samples apart.", null, "autocorrelation", one.max_autocorrelation],
    ["Past command in the residuals, p", probability(one.input_correlation_p), "Does the command still explain part of what is left over?", verdict(one.input_correlation_p, "nothing of it seen", "the model misses some of it"), "input", one.input_correlation_p],
    ["AICc", fixed(one.aicc, 1), "Compares models of this same log; smaller is better. Its size alone says nothing.", null, "aicc", one.aicc],
    ["BIC", fixed(one.bic, 1), "As AICc, harder on models with many parameters.", null, "bic", one.bic],
    ["Rows used", String(one.rows_used), "Of the log, after gaps and spans left out.", null, "rows", one.rows_used],
  ];
  return section("statistics", "Quality of the fit", "Tests are read at the 5 % level.",
    table("Statistics of the selected fit", ["Statistic", "Value", "What it means"],
      rows.map(([label, text, meaning, mark, id, value]) => [label,
        value === null || value === undefined ? h("span", { "data-testid": `statistic-${id}` }, "not available") : h("data", { value, "data-testid": `statistic-${id}` }, text),
        [meaning, mark && [" ", mark]]]), { class: "explained" }));
}
