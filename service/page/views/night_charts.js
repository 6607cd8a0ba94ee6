// A loop's parameters, fit quality and margins, night by night.

import { historyCharts, KINDS, ring, sample } from "/page/charts/history.js";
import { h, section, symbol, table } from "/page/dom.js";
import { estimate, fixed, instant, interval, significant, withUnit } from "/page/format.js";
import { besideOf, kindOf } from "/page/views/nights.js";

const of = (row, names) => names.map((name) => row.parameters[name] ?? row.derived[name]).find(Boolean) ?? null;

/** A panel of estimates: the parameter by the first of these names that a night has. */
function estimates(rows, drift, key, title, names, note) {
  const all = rows.map((row) => of(row, names));
  const moved = drift?.parameters[key];
  const unit = all.find(Boolean)?.unit ?? "";
  const first = rows.map((row) => besideOf(row)[key] ?? null);
  const said = (one) => { const shown = estimate(one); return `${withUnit(shown.value, unit)} (${interval(shown)})`; };
  const text = (i) => said(all[i]) + (first[i] ? `; first order ${said(first[i])}` : "");
  return {
    key, title, unit, note, text,
    beside: first.map((one) => one?.value ?? null),
    heading: () => [title, " ", symbol(key)],
    values: all.map((one) => one?.value ?? null),
    intervals: all.map((one) => one?.ci95 ?? null),
    reference: moved ? { value: moved.baseline, practical: moved.practical } : null,
    nothing: "No night could tell it.",
  };
}

function figures(rows, key, title, heading, unit, value, text, extra = {}) {
  const values = rows.map(value);
  return { key, title, heading, unit, values, intervals: values.map(() => null), beside: [], reference: null, text: (i) => text(values[i]), nothing: "No night has it.", ...extra };
}

function described(panel, rows) {
  const known = panel.values.filter((v) => v !== null);
  if (!known.length) return "Nothing to show.";
  const unit = panel.unit ? ` ${panel.unit}` : "";
  return `${known.length} of ${rows.length} nights, between ${significant(Math.min(...known), 3)} and ${significant(Math.max(...known), 3)}${unit}; the last ${significant(known[known.length - 1], 3)}${unit}. The table below holds the figures.`;
}

const WHOSE = { installed: " of the installed settings", log: " of the controller that the logs show", baseline: " of the baseline’s proposal" };

function margins(rows, target) {
  const whose = rows.find(({ margins_of }) => margins_of)?.margins_of;
  const unstable = rows.filter(({ margins: one }) => one && !one.stable).length;
  const panel = figures(rows, "Ms", "Ms of the controller", () => [symbol("Ms"), WHOSE[whose] ?? " of the installed settings"], "",
    ({ margins: one }) => one?.Ms ?? null, (v) => fixed(v, 3), {
      limit: target, nothing: "Tell the installed settings, or choose a baseline: then the margins are followed.",
      note: `Dotted: the target, ${fixed(target, 2)}.${unstable ? ` On ${unstable} of the nights the loop would be unstable; they have no Ms.` : ""}`,
    });
  const said = (end) => (end === null ? "unstable" : fixed(end, 3));
  panel.intervals = rows.map(({ margins_interval: one }) => one?.ci95 ?? null);
  panel.text = (i) => fixed(panel.values[i], 3) + (panel.intervals[i] ? ` (${panel.intervals[i].map(said).join(" to ")})` : "");
  return panel;
}

export function nightCharts(rows, drift, loop, onReport) {
  const second = rows.some(({ parameters }) => "T1" in parameters || "zeta" in parameters);
  const mixed = second ? "Nights whose log chose a second-order model stand with the sum of its time constants, and with its own dead time; the rings are the first-order fits, which the verdict compares." : null;
  const unit = rows.find(({ speed_unit }) => speed_unit)?.speed_unit ?? "";
  const panels = [
    estimates(rows, drift, "K", "Static gain", ["K"]),
    estimates(rows, drift, "T", "Time constant", ["T", "T1 + T2", "T_r"]),
    estimates(rows, drift, "L", "Dead time", ["L"]),
    margins(rows, loop.defaults.Ms),
    figures(rows, "fit", "Fit quality", () => ["Fit quality"], "%", (row) => row.fit_percent, (v) => withUnit(fixed(v, 2), "%"), { note: "NRMSE of the simulated response; 100 % is perfect." }),
    figures(rows, "rms", "Residual, root mean square", () => ["Residual, rms"], unit, (row) => row.rms_residual, (v) => withUnit(significant(v, 3), unit), { note: "Grows where noise, friction or a fault comes in." }),
  ].map((panel) => ({ ...panel, describe: described(panel, rows) }));
  const kinds = rows.map((row) => kindOf(row, drift));
  const nights = rows.map((row, i) => ({ at: Date.parse(row.at), kind: kinds[i], name: `${instant(row.at)}${row.start ? "" : " (received)"}` }));
  const told = (panel, i) => (panel.values[i] === null ? "–" : panel.text(i));
  return section("history", "Night by night", ["Bars are 95 % intervals from each log’s own noise, those of Ms over the plants that the log allows. ", drift && "The line is the baseline, the band the changes too small to count. ", "Times are UTC."],
    h("ul", { class: "legend" }, KINDS.filter(([kind]) => kinds.includes(kind)).map(([kind, text]) => h("li", {}, sample(kind), drift || kind !== "plain" ? text : "one night")),
      rows.some((row) => besideOf(row).T) && h("li", {}, ring(), "first-order fit of the same log")),
    historyCharts(nights, panels, (i) => onReport(rows[i].report_id)),
    mixed && h("p", { class: "note below" }, mixed),
    h("details", { class: "fold small", "data-testid": "history-table" }, h("summary", {}, "As a table, with the intervals"),
      table("The nights in figures", ["Night", ...panels.map(({ heading, unit: u }) => [heading(), u && ` (${u})`])],
        nights.map(({ name }, i) => [name, ...panels.map((panel) => told(panel, i))]), { class: "long" })));
}
