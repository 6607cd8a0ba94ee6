// The nights as a list: each with its report and verdict; the ticked ones are the baseline.

import { h, section, symbol, table } from "/page/dom.js";
import { estimate, fixed, instant, significant, withUnit } from "/page/format.js";
import { reportAddress } from "/page/views/addresses.js";
import { besideOf } from "/page/views/nights.js";
import { verdictMark } from "/page/views/verdict.js";

function figure(one) {
  if (!one) return "–";
  const shown = estimate(one);
  return shown.std === "–" ? shown.value : `${shown.value} ± ${shown.std}`;
}

function remark(row, drift) {
  if (row.in_baseline) return h("span", { class: "badge" }, "baseline");
  const night = drift?.nights.find(({ report_id }) => report_id === row.report_id);
  if (night) return h("span", { title: night.unusable }, verdictMark({ ...night, as_of: night.at }));
  return row.excitation.sufficient ? h("span", { class: "note" }, "not compared") : h("span", { class: "note", title: row.excitation.reason }, "too little in it");
}

export function nightTable(rows, drift, loop, onBaseline) {
  const problem = h("p", { class: "notice", role: "alert", hidden: true, "data-testid": "baseline-problem" });
  const count = h("span", { class: "note", "aria-live": "polite" });
  const boxes = rows.map((row) => h("input", {
    type: "checkbox", checked: row.in_baseline, value: row.report_id, "aria-label": `${instant(row.at)} in the baseline`, disabled: row.model === null, onchange: tell,
  }));
  const chosen = () => boxes.filter((box) => box.checked).map((box) => box.value);
  const save = h("button", { class: "button", type: "submit", "data-testid": "save-baseline" }, "Compare with the ticked nights");
  function tell() {
    const n = chosen().length;
    count.textContent = n === 0 ? "None ticked: there will be no verdict." : n === 1 ? "One night ticked; several say more." : `${n} nights ticked.`;
    save.textContent = n === 0 && loop.baseline.length ? "Stop comparing" : "Compare with the ticked nights";
  }
  tell();
  const speed = rows.find(({ speed_unit }) => speed_unit)?.speed_unit;
  const gain = rows.map(({ parameters }) => parameters.K?.unit).find(Boolean);
  const T = ({ parameters, derived }) => parameters.T ?? derived["T1 + T2"] ?? derived.T_r;
  const cell = (row, name, one) => [figure(one), besideOf(row)[name] ? h("span", { class: "gloss" }, "first order", h("br"), figure(besideOf(row)[name])) : ""];
  return section("nights", "The nights", "In the order of the logs’ own time. Tick those on which the loop was as it should be; later ones are compared with them.",
    h("form", { "data-testid": "baseline", onsubmit: async (event) => {
      event.preventDefault();
      problem.hidden = true;
      try {
        await onBaseline(chosen());
      } catch (error) {
        if (error.name === "AbortError") return;
        problem.textContent = error.message;
        problem.hidden = false;
      }
    } },
    table("The nights", ["Night (UTC)", "Baseline", [symbol("K"), gain && ` (${gain})`], [symbol("T"), " (s)"], [symbol("L"), " (s)"], "Fit", "Residual, rms", symbol("Ms"), "Verdict"],
      rows.map((row, i) => ({ attributes: { "data-testid": "night" }, cells: [
        [h("a", { href: reportAddress(row.report_id) }, instant(row.at).replace(/(:\d\d)(:\d\d(\.\d+)?) UTC$/, "$1")), row.start ? "" : h("span", { class: "gloss" }, "received")],
        boxes[i], cell(row, "K", row.parameters.K ?? row.derived.K), cell(row, "T", T(row)), cell(row, "L", row.parameters.L ?? row.derived.L),
        withUnit(fixed(row.fit_percent, 1), "%"), withUnit(significant(row.rms_residual, 3), speed), row.margins && !row.margins.stable ? "unstable" : fixed(row.margins?.Ms, 3), remark(row, drift)] })), { class: "stack nights" }),
    h("p", { class: "after" }, save, count), problem));
}
