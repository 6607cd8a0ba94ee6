// A predicted response: speed above, command below, one time axis, one line per proposal.

import { line, plot } from "/page/charts/plot.js";
import { extent } from "/page/charts/scale.js";
import { h } from "/page/dom.js";

/** series: [{mark, time, speed, command}]; labels: {speed, command}. */
export function responses(width, series, labels, title, describe) {
  const end = Math.max(...series.map(({ time }) => time[time.length - 1]));
  const panel = (key, height, last) => {
    const { node, X, Y, area } = plot({
      width, height, title: `${title}: ${key}`, describe, margin: { top: 28, bottom: last ? 40 : 24 },
      x: { domain: [0, end], label: last ? "Time after the step, s" : null }, y: { domain: extent(series.map((one) => one[key]), 0.08, [0]), label: labels[key] },
    });
    for (const one of [...series].reverse()) area.append(line(X, Y, one.time, one[key], { class: one.mark }));
    return node;
  };
  return h("div", {}, panel("speed", 230, false), panel("command", 190, true));
}
