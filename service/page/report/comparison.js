// The fits that were tried beside the chosen one: how each describes the log, and what was noticed about it.

import { h, section, table } from "/page/dom.js";
import { fixed, significant, withUnit } from "/page/format.js";
import { findingList } from "/page/report/findings.js";
import { parameterTable } from "/page/report/parameters.js";
import { MODELS, word } from "/page/report/words.js";

function row(report, fit, i) {
  const { statistics: one } = fit;
  const chosen = i === report.selected;
  return {
    attributes: { class: chosen ? "recommended" : null, "data-testid": `fit-${fit.model}` },
    cells: [[word(MODELS, fit.model), chosen && [" ", h("span", { class: "badge" }, "chosen")]],
      fixed(one.aicc, 1), withUnit(fixed(one.fit_percent, 2), "%"), withUnit(fixed(one.validation_fit_percent, 2), "%"),
      withUnit(significant(one.rms_residual, 3), report.log.speed_unit), one.noise_order === null || one.noise_order === undefined ? "–" : String(one.noise_order)],
  };
}

const METHODS = { "high-order-arx": "Difference equation of high order", subspace: "Subspace model" };

// How far models that presume no structure agree with the chosen one on the answer to a step.
function crossChecks(report) {
  const checks = report.cross_checks ?? [];
  if (checks.length === 0) return null;
  return [
    h("p", { class: "note" }, "Beside models that presume no structure: the answer to a step, differences in percent of the settled gain."),
    table("The chosen model beside models without structure",
      ["Model without structure", "Agreement", "Largest difference", "at", "Chance alone, up to"],
      checks.map((one) => ({
        attributes: { "data-testid": `cross-check-${one.method}` },
        cells: [word(METHODS, one.method), withUnit(fixed(one.agreement_percent, 1), "%"),
          withUnit(fixed(one.max_difference_percent, 1), "%"), withUnit(significant(one.at_s, 3), "s"),
          one.bound_percent === null ? "–" : withUnit(fixed(one.bound_percent, 1), "%")],
      })), { class: "stack" }),
  ];
}

export function comparison(report) {
  if (report.selected === null) return null;
  const others = report.fits.filter((_, i) => i !== report.selected);
  return section("comparison", "Models compared", "All on the same rows. AICc weighs the misfit against the number of parameters, smaller is better; a noise order of 0 is white noise.",
    h("p", { "data-testid": "selected-because" }, report.selected_because),
    table("The fits beside each other", ["Model", "AICc", "Fit", "Fit on a held-out span", "Residual, rms", "Noise order"],
      report.fits.map((fit, i) => row(report, fit, i)), { class: "stack" }),
    crossChecks(report),
    others.map((fit) => h("details", { class: "fold small", "data-testid": `other-${fit.model}` },
      h("summary", {}, `Not chosen: ${word(MODELS, fit.model).toLowerCase()}`),
      parameterTable(fit),
      fit.findings.length > 0 && [h("p", { class: "note" }, "Noticed about this fit only; it does not concern the chosen one:"),
        h("div", { class: "severity" }, findingList(fit.findings.map((one) => ["", one])))])));
}
