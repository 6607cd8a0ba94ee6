// What the model leaves over, in time and against itself.

import { dataTable } from "/page/charts/data_table.js";
import { responsive } from "/page/charts/plot.js";
import { autocorrelation } from "/page/charts/small.js";
import { trend as strips } from "/page/charts/trend.js";
import { h, section } from "/page/dom.js";
import { significant, withUnit } from "/page/format.js";

export function residuals(report) {
  const { trend, autocorrelation: correlation } = report.curves;
  if (report.selected === null || !trend.residual) return null;
  const { rms_residual } = report.fits[report.selected].statistics;
  const unit = report.log.speed_unit;
  const rms = withUnit(significant(rms_residual, 3), unit);
  const outside = correlation?.value.filter((value) => Math.abs(value) > correlation.bound).length;
  const said = correlation && `${outside} of ${correlation.lag.length} lags lie outside the band in which white noise stays 19 times out of 20.`;
  return section("residuals", "Residuals", "Measured speed less fitted response. Noise without a pattern is what a good model leaves.",
    strips(trend.time_s, [{ title: "Residual", unit, height: 150, describe: `Residuals over time, root mean square ${rms}.`, series: [{ name: `rms ${rms}`, kind: "residual", values: trend.residual }] }]),
    dataTable("Residuals", [["Time, s", trend.time_s], ["Residual", trend.residual]]),
    correlation && [
      h("h3", {}, "Autocorrelation"), h("p", { class: "note" }, said),
      responsive((width) => autocorrelation(width, correlation, said)),
      dataTable("Autocorrelation of the residuals", [["Lag, samples", correlation.lag], ["Autocorrelation", correlation.value]]),
    ]);
}
