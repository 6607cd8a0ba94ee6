// The log as measured, the fitted response over it, the command below.

import { dataTable } from "/page/charts/data_table.js";
import { trend as strips } from "/page/charts/trend.js";
import { section } from "/page/dom.js";
import { duration, fixed } from "/page/format.js";

export function trend(report) {
  const { time_s, setpoint, command, speed, fitted } = report.curves.trend;
  const { speed_unit, command_unit } = report.log;
  const series = [
    { name: "Measured speed", kind: "measured", values: speed },
    fitted && { name: "Fitted response", kind: "fitted", values: fitted },
    setpoint && { name: "Setpoint", kind: "setpoint", values: setpoint },
  ].filter(Boolean);
  const fit = report.selected === null ? null : report.fits[report.selected].statistics.fit_percent;
  const described = `Speed over ${duration(report.log.duration_s)}.${fit === null ? "" : ` The fitted response explains it to ${fixed(fit, 1)} percent.`} The table below holds the figures.`;
  return section("trend", fitted ? "Log and fitted response" : "The log",
    fitted ? "The fitted response is simulated from the command alone; it never sees the measured speed." : null,
    strips(time_s, [
      { title: "Speed", unit: speed_unit, height: 300, describe: described, series },
      { title: "Command", unit: command_unit, height: 140, describe: "The command over the same time.", series: [{ name: "Command", kind: "command", values: command }] },
    ]),
    dataTable("Log and fitted response", [["Time, s", time_s], ...series.map(({ name, values }) => [name, values]), ["Command", command]]));
}
