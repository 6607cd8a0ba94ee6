// What each proposal is predicted to do with a setpoint step and with a load step.

import { dataTable } from "/page/charts/data_table.js";
import { legend } from "/page/charts/legend.js";
import { responsive } from "/page/charts/plot.js";
import { responses } from "/page/charts/responses.js";
import { h, section } from "/page/dom.js";
import { fixed, significant, withUnit } from "/page/format.js";
import { lineOf, METHODS, word } from "/page/report/words.js";

function chart(shown, key, labels, title, said) {
  const series = shown.map(({ mark, predicted }) => {
    const { time_s: time, speed, command } = predicted[key].response;
    return { mark, time, speed, command };
  });
  return h("div", {}, h("h3", {}, title), h("p", { class: "note" }, said),
    responsive((width) => responses(width, series, labels, title, said)),
    shown.map(({ name, predicted }) => {
      const { time_s, speed, command } = predicted[key].response;
      return dataTable(`${title}: ${name}`, [["Time, s", time_s], [labels.speed, speed], [labels.command, command]], name);
    }));
}

export function predicted(report) {
  const order = (i) => (i === report.recommended ? -1 : i);
  const shown = report.tunings.map((one, i) => ({ ...one, i, name: word(METHODS, one.method), mark: lineOf(i, report.recommended) }))
    .filter((one) => one.predicted).sort((a, b) => order(a.i) - order(b.i));
  if (!shown.length) return null;
  const { speed_unit: y, command_unit: u } = report.log;
  const labels = { speed: `Change of speed${y && `, ${y}`}`, command: `Change of command${u && `, ${u}`}` };
  const { setpoint_step: set, load_step: load } = shown[0].predicted;
  return section("predicted", "Predicted responses", "The fitted model with each proposal, before anyone touches the machine. They scale with the size of the step as long as the command stays off its limits.",
    legend(shown),
    h("div", { class: "pair" },
      chart(shown, "setpoint_step", labels, `Setpoint step of ${withUnit("1", y || "unit")}`,
        `${shown[0].name}: overshoot ${withUnit(fixed(set.overshoot_percent, 1), "%")}, settled to 2 % after ${withUnit(significant(set.settling_time_s, 3), "s")}.`),
      chart(shown, "load_step", labels, `Load step of ${withUnit("1", u || "unit")} at the motor’s input`,
        `${shown[0].name}: at most ${withUnit(significant(load.peak_deviation, 3), y)} off, nearly back after ${withUnit(significant(load.recovery_time_s, 3), "s")}.`)));
}
