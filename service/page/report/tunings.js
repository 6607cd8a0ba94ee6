// Every proposal with its margins, beside the installed settings where the log gives them away.

import { h, section, symbol, table } from "/page/dom.js";
import { estimate, fixed, per, significant, withUnit } from "/page/format.js";
import { METHODS, word } from "/page/report/words.js";

export function marginCells({ stable, Ms, Mt, gain_margin, phase_margin_deg, delay_margin_s }) {
  if (!stable) return [h("strong", { class: "verdict poor" }, "▲ unstable"), "–", "–", "–", "–"];
  return [fixed(Ms, 3), fixed(Mt, 3), gain_margin === null ? "no limit" : `× ${significant(gain_margin, 3)}`,
    withUnit(fixed(phase_margin_deg, 1), "°"), withUnit(significant(delay_margin_s, 3), "s")];
}

function known(value, std) {
  if (std === null || std === undefined) return significant(value, 4);
  const shown = estimate({ value, std, ci95: [null, null] });
  return `${shown.value} ± ${shown.std}`;
}

function proposals(report) {
  const { tunings, recommended, installed, log } = report;
  const pid = tunings.some(({ settings }) => settings.Td > 0);
  const gain = per(log.command_unit, log.speed_unit);
  const head = ["Proposal", [symbol("Kp"), gain && ` (${gain})`], [symbol("Ti"), " (s)"], ...(pid ? [[symbol("Td"), " (s)"], [symbol("Tf"), " (s)"]] : []), symbol("b"),
    symbol("Ms"), symbol("Mt"), "Gain margin", "Phase margin", "Delay margin"];
  const body = tunings.map(({ method, settings, margins }, i) => ({
    attributes: { class: i === recommended ? "recommended" : null, "data-testid": `tuning-${i}` },
    cells: [[word(METHODS, method), i === recommended && [" ", h("span", { class: "badge" }, "recommended")]],
      significant(settings.Kp), significant(settings.Ti), ...(pid ? [significant(settings.Td), significant(settings.Tf)] : []), significant(settings.b, 3), ...marginCells(margins)],
  }));
  if (installed) {
    const { settings, std, margins } = installed;
    body.push({ attributes: { "data-testid": "installed" }, cells: ["Installed, as recovered from the log (± one standard deviation)",
      known(settings.Kp, std.Kp), known(settings.Ti, std.Ti), ...(pid ? [significant(settings.Td), significant(settings.Tf)] : []), known(settings.b, std.b), ...marginCells(margins)] });
  }
  return table("Proposed settings and their margins", head, body, { class: "stack", "data-testid": "tunings" });
}

function outcome(report) {
  const { speed_unit: y, command_unit: u } = report.log;
  const rows = report.tunings.map(({ method, predicted }) => [method, predicted]).filter(([, predicted]) => predicted);
  if (!rows.length) return null;
  return [h("h3", {}, "Outcome to expect"),
    table("Predicted outcome of each proposal",
      ["Proposal", "Overshoot", "Rise time", "Settling time", ["Peak deviation per ", u ? `1 ${u} of load` : "unit load"], "Recovery time"],
      rows.map(([method, { setpoint_step: set, load_step: load }]) => [word(METHODS, method), withUnit(fixed(set.overshoot_percent, 1), "%"),
        withUnit(significant(set.rise_time_s, 3), "s"), withUnit(significant(set.settling_time_s, 3), "s"), withUnit(significant(load.peak_deviation, 3), y), withUnit(significant(load.recovery_time_s, 3), "s")]), { class: "stack" })];
}

function allowed(report) {
  const rows = report.tunings.filter(({ worst_case }) => worst_case);
  if (!rows.length) return null;
  return [h("h3", {}, "Over all plants that the log allows"),
    table("Margins over the plants that the log allows", ["Proposal", [symbol("Ms"), ", median"], [symbol("Ms"), ", 95 % stay below"], "Unstable", "Plants tried"],
      rows.map(({ method, worst_case: one }) => [word(METHODS, method), fixed(one.Ms_median, 3), fixed(one.Ms_p95, 3), withUnit(fixed(100 * one.unstable_share, 1), "%"), String(one.plants)]), { class: "stack" })];
}

export function tunings(report) {
  if (!report.tunings.length && !report.installed) return null;
  return section("tunings", "Proposals", report.recommended === null ? report.recommended_because : ["Recommended: ", report.recommended_because],
    proposals(report), outcome(report), allowed(report));
}
