// What was noticed, gravest first, each with the figures behind it; then the cautions.

import { h, section } from "/page/dom.js";
import { significant } from "/page/format.js";
import { METHODS, MODELS, word } from "/page/report/words.js";

const SEVERITIES = [
  ["error", "Mend before use", "■"],
  ["warning", "Check before use", "▲"],
  ["info", "Worth knowing", "●"],
];

function collect(report) {
  const all = [
    ...report.findings.map((one) => ["", one]),
    ...report.log.findings.map((one) => ["the log", one]),
    // What was noticed about a fit that was not chosen stands with the comparison of the models.
    ...report.fits.filter((_, i) => report.selected === null || i === report.selected).flatMap((fit) => fit.findings.map((one) => [word(MODELS, fit.model).toLowerCase(), one])),
    ...report.tunings.flatMap((tuning) => tuning.findings.map((one) => [word(METHODS, tuning.method), one])),
  ];
  const seen = new Set();
  return all.filter(([, { code, message }]) => {
    const key = `${code}\n${message}`;
    return !seen.has(key) && seen.add(key);
  });
}

function evidence(figures) {
  const entries = Object.entries(figures ?? {});
  return entries.length > 0 && h("details", { class: "evidence" }, h("summary", {}, "Figures"),
    h("dl", {}, entries.map(([key, value]) => h("div", {}, h("dt", {}, key.replaceAll("_", " ")),
      h("dd", {}, typeof value === "number" ? significant(value, 5) : String(value ?? "–"))))));
}

/** The findings as a list: [[what about, finding]]. */
export function findingList(some) {
  return h("ul", {}, some.map(([about, one]) => h("li", { "data-testid": `finding-${one.code}` },
    h("p", {}, one.message), h("p", { class: "hint" }, about && `${about} · `, h("code", {}, one.code)), evidence(one.evidence))));
}

export function findings(report) {
  const all = collect(report);
  return section("findings", "Findings", all.length ? null : "Nothing stood out.",
    SEVERITIES.map(([severity, title, mark]) => {
      const some = all.filter(([, one]) => one.severity === severity);
      return some.length > 0 && h("div", { class: `severity ${severity}` },
        h("h3", {}, h("span", { class: "shape", "aria-hidden": "true" }, mark), title),
        findingList(some));
    }));
}

export function cautions(report) {
  if (!report.cautions.length) return null;
  const title = report.recommended === null ? "Before the next test" : "Before you type them in";
  return section("cautions", title, null, h("ul", { class: "cautions" }, report.cautions.map((text) => h("li", {}, text))));
}
