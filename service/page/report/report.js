// The whole report on one sheet, most wanted first.

import { h } from "/page/dom.js";
import { instant } from "/page/format.js";
import { comparison } from "/page/report/comparison.js";
import { cautions, findings } from "/page/report/findings.js";
import { headline } from "/page/report/headline.js";
import { log } from "/page/report/log.js";
import { parameters, profile } from "/page/report/parameters.js";
import { predicted } from "/page/report/predicted.js";
import { residuals } from "/page/report/residuals.js";
import { robustness } from "/page/report/robustness.js";
import { statistics } from "/page/report/statistics.js";
import { toSet } from "/page/report/to_set.js";
import { trend } from "/page/report/trend.js";
import { tunings } from "/page/report/tunings.js";
import { againForm } from "/page/views/options.js";

function download(report, file) {
  return h("button", { type: "button", class: "button quiet", "data-testid": "download", onclick: () => {
    const url = URL.createObjectURL(new Blob([JSON.stringify(report, null, 1)], { type: "application/json" }));
    h("a", { href: url, download: `${file}-report.json` }).click();
    setTimeout(() => URL.revokeObjectURL(url), 1000);
  } }, "Download JSON");
}

/**
 * data: as the service gave it; name: of the file, or of the night. Either
 * onAgain(form), options   a one-off: analyse the same log otherwise
 * loop {name, href}, file, target   kept: whose log it is, name for a download, another target's form
 */
export function report(data, { name, file = name.replace(/\.\w+$/, ""), loop, target, onAgain, options }) {
  return h("article", { class: "report", "data-testid": "report" },
    h("header", { class: "report-head" },
      h("div", {}, h("p", { class: "eyebrow" }, loop ? ["Report on a log of ", h("a", { href: loop.href, "data-testid": "report-loop" }, loop.name)] : "Report on one log"),
        h("h1", {}, name), !loop && data.log.start && h("p", { class: "note" }, instant(data.log.start))),
      h("div", { class: "actions" }, download(data, file), h("button", { type: "button", class: "button quiet", onclick: () => print() }, "Print"))),
    headline(data), findings(data), trend(data), predicted(data), robustness(data), tunings(data), toSet(data), target, cautions(data),
    parameters(data), profile(data), comparison(data), statistics(data), residuals(data), log(data, loop ? null : name),
    onAgain && againForm(options, onAgain, { "data-testid": "again-fold" }));
}
