// Every proposal with its margins, beside the installed settings where the log gives them away.

import { h, section, symbol, table } from "/page/dom.js";
import { estimate, fixed, per, significant, withUnit } from "/page/format.js";
import { METHODS, word } from "/page/report/words.js";

export function marginCells(margins) {
  if (!margins) return ["–", "–", "–", "–", "–"];
  const { stable, Ms, Mt, gain_margin, phase_margin_deg, delay_margin_s } = margins;
  if (!stable) return [h("strong", { class: "verdict poor" }, "▲ unstable"), "–", "–", "–", "–"];
  return [fixed(Ms, 3), fixed(Mt, 3), gain_margin === null ? "no limit" : `× ${significant(gain_margin, 3)}`,
    withUnit(fixed(phase_margin_deg, 1), "°"), withUnit(significant(delay_margin_s, 3), "s")];
}

// A deviation below the digits shown would only crowd the table.
function known(value, std, digits = 4) {
  if (std === null || std === undefined || std < 2e-3 * Math.abs(value)) return significant(value, digits);
  const shown = estimate({ value, std, ci95: [null, null] });
  return `${shown.value} ± ${shown.std}`;
}

function proposals(report) {
  const { tunings, recommended, installed, log } = report;
  const pid = [...tunings, installed].some((one) => one && (one.settings.Td > 0 || one.settings.Tf > 0));
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
    body.push({ attributes: { "data-testid": "installed", class: "installed" }, cells: [installed.source === "told" ? "Installed, as told" : "Installed, as the log shows",
      known(settings.Kp, std.Kp), known(settings.Ti, std.Ti), ...(pid ? [known(settings.Td, std.Td), known(settings.Tf, std.Tf)] : []), known(settings.b, std.b, 3), ...marginCells(margins)] });
  }
  return table("Proposed settings and their margins", head, body, { class: "stack", "data-testid": "tunings" });
}

const FILTERED = { derivative: "its derivative is filtered", speed: "it filters the measured speed", "speed, second order": "it filters the measured speed twice" };

// What kind of controller the log shows, and how its settings read where it sums the error by another rule.
function inMachine({ installed, log }) {
  if (!installed || installed.source === "told") return null;
  const { form, filter_on, period_s, late_s, R2, readings } = installed;
  const kind = form === "PI-D" ? "a PID with its derivative on the speed alone" : `a ${form}`;
  const facts = [`The controller in this log is ${kind}${filter_on in FILTERED ? `, ${FILTERED[filter_on]}` : ""}, every ${withUnit(significant(period_s, 3), "s")}`,
    late_s > 0 && `it answers ${withUnit(significant(late_s, 3), "s")} after the speed is logged`,
    `R² of its command ${R2 > 0.99995 ? "above 0.9999" : fixed(R2, 4)}`].filter(Boolean).join("; ");
  const gain = per(log.command_unit, log.speed_unit);
  const rules = [["backward", "adds the newest error"], ["forward", "adds the error before it"]].filter(([rule]) => readings[rule])
    .map(([rule, does]) => `Kp ${withUnit(significant(readings[rule].Kp, 4), gain)}, Ti ${withUnit(significant(readings[rule].Ti, 4), "s")} if its integral ${does}`).join("; ");
  return h("p", { class: "note below", "data-testid": "installed-kind" }, `${facts}. The table reads its integral as a trapezoid${rules && `; typed in, the same controller reads ${rules}`}.`);
}

function outcome(report) {
  const { speed_unit: y, command_unit: u } = report.log;
  const gain = per(u, y);
  const inPlace = report.installed?.predicted ? [["installed", report.installed.predicted]] : [];
  const rows = [...report.tunings.map(({ method, predicted }) => [method, predicted]).filter(([, predicted]) => predicted), ...inPlace];
  if (!rows.length) return null;
  return [h("h3", {}, "Outcome to expect"),
    table("Predicted outcome of each proposal",
      ["Proposal", "Overshoot", "Rise time", "Settling time", ["Peak deviation per ", u ? `1 ${u} of load` : "unit load"], "Recovery time", ["Command travel", gain && ` (${gain})`]],
      rows.map(([method, { setpoint_step: set, load_step: load }]) => [word(METHODS, method), withUnit(fixed(set.overshoot_percent, 1), "%"),
        withUnit(significant(set.rise_time_s, 3), "s"), withUnit(significant(set.settling_time_s, 3), "s"), withUnit(significant(load.peak_deviation, 3), y), withUnit(significant(load.recovery_time_s, 3), "s"), significant(set.total_variation, 3)]), { class: "stack" })];
}

function allowed(report) {
  const rows = report.tunings.filter(({ worst_case }) => worst_case);
  if (!rows.length) return null;
  return [h("h3", {}, "Over all plants that the log allows"),
    table("Margins over the plants that the log allows", ["Proposal", [symbol("Ms"), ", median"], [symbol("Ms"), ", 95 % stay below"], "Unstable", "Plants tried"],
      rows.map(({ method, worst_case: one }) => [word(METHODS, method), fixed(one.Ms_median, 3), fixed(one.Ms_p95, 3), withUnit(fixed(100 * one.unstable_share, 1), "%"), String(one.plants)]), { class: "stack" })];
}

function knownRules(report) {
  if (!report.rules?.length) return null;
  const pid = report.rules.some(({ settings }) => settings.Td > 0);
  return h("details", { class: "below", "data-testid": "rules" }, h("summary", {}, "Published rules on this plant, for comparison"),
    table("Published rules and the margins they have here", ["Rule", symbol("Kp"), [symbol("Ti"), " (s)"], ...(pid ? [[symbol("Td"), " (s)"]] : []), symbol("Ms"), symbol("Mt"), "Gain margin", "Phase margin", "Delay margin", "Target"],
      report.rules.map(({ method, settings, margins, meets_target }) => [word(METHODS, method), significant(settings.Kp), significant(settings.Ti), ...(pid ? [significant(settings.Td)] : []),
        ...marginCells(margins), meets_target ? "met" : "missed"]), { class: "stack" }));
}

export function tunings(report) {
  if (!report.tunings.length && !report.installed) return null;
  return section("tunings", "Proposals", report.recommended === null ? report.recommended_because : ["Recommended: ", report.recommended_because],
    proposals(report), inMachine(report), outcome(report), allowed(report), knownRules(report));
}
