// Strips over one time axis, drawn by uPlot: zoomed together, read off together.

/* global uPlot */
import { decimals } from "/page/charts/scale.js";
import { h } from "/page/dom.js";
import { fixed, significant, withUnit } from "/page/format.js";

const KINDS = {
  measured: { colour: "--measured", width: 1 },
  fitted: { colour: "--accent", width: 2 },
  setpoint: { colour: "--setpoint", width: 1.5, dash: [7, 4], stepped: true },
  command: { colour: "--command", width: 1.5, stepped: true },
  residual: { colour: "--measured", width: 1 },
};

const colour = (name) => () => getComputedStyle(document.documentElement).getPropertyValue(name).trim();
const FONT = "12px system-ui, sans-serif";

function axis(extra) {
  return { stroke: colour("--quiet"), font: FONT, ticks: { show: false }, grid: { stroke: colour("--rule"), width: 1 }, ...extra };
}

function chart(strip, time, width, last, group, onCursor, onScale) {
  const labels = (_, values) => {
    const step = values.length > 1 ? Math.abs(values[1] - values[0]) : 1;
    return values.map((v) => fixed(v, decimals(step)));
  };
  return new uPlot({
    width,
    height: strip.height,
    padding: [8, 12, 0, 0],
    legend: { show: false },
    cursor: { sync: { key: group }, points: { show: false }, drag: { x: true, y: false } },
    scales: { x: { time: false } },
    axes: [axis({ size: last ? 32 : 12, values: last ? labels : () => [] }), axis({ size: 52, space: strip.height > 200 ? 34 : 22, values: labels })],
    series: [{}, ...strip.series.map(({ kind }) => ({
      stroke: colour(KINDS[kind].colour),
      width: KINDS[kind].width,
      dash: KINDS[kind].dash,
      paths: KINDS[kind].stepped ? uPlot.paths.stepped({ align: 1 }) : undefined,
      points: { show: false },
    }))],
    hooks: { setCursor: [(u) => onCursor(u.cursor.idx)], setScale: [(u, key) => key === "x" && onScale(u)] },
  }, [time, ...strip.series.map(({ values }) => values)]);
}

/** strips: [{title, unit, height, describe, series: [{name, kind, values}]}]; time in s. */
export function trend(time, strips) {
  const outputs = strips.map((strip) => strip.series.map(() => h("output", { class: "figures" })));
  const clock = h("output", { class: "figures" });
  const holders = strips.map((strip) => h("div", { class: "strip", role: "img", "aria-label": strip.describe }));
  const group = `trend-${Math.random()}`;
  let charts = [];
  let busy = false;

  function read(i) {
    clock.textContent = i === null || i === undefined ? "" : `at ${significant(time[i], 5)} s`;
    strips.forEach((strip, k) => strip.series.forEach(({ values }, j) => {
      const value = i === null || i === undefined ? null : values[i];
      outputs[k][j].textContent = value === null || value === undefined ? "" : withUnit(significant(value, 4), strip.unit);
    }));
  }
  function follow(from) {
    if (busy) return;
    busy = true;
    const { min, max } = from.scales.x;
    charts.filter((c) => c !== from).forEach((c) => c.setScale("x", { min, max }));
    busy = false;
  }
  function move(change) {
    if (!charts.length) return;
    const [first, end] = [time[0], time[time.length - 1]];
    const { min, max } = charts[0].scales.x;
    const [low, high] = change(min, max, first, end);
    // Never narrower than a few rows, never wider than the log.
    const span = Math.min(Math.max(high - low, (6 * (end - first)) / time.length), end - first);
    const start = Math.min(Math.max(low, first), end - span);
    charts.forEach((c) => c.setScale("x", { min: start, max: start + span }));
  }
  const zoom = (factor) => (min, max) => [(min + max) / 2 - ((max - min) * factor) / 2, (min + max) / 2 + ((max - min) * factor) / 2];
  const shift = (share) => (min, max) => [min + (max - min) * share, max + (max - min) * share];
  const button = (text, label, change) => h("button", { type: "button", class: "tool", "aria-label": label, title: label, onclick: () => move(change) }, text);

  const box = h("div", { class: "trend" },
    h("div", { class: "tools", role: "group", "aria-label": "Zoom" },
      button("◂", "Earlier", shift(-0.4)), button("▸", "Later", shift(0.4)), button("+", "Zoom in", zoom(0.5)),
      button("−", "Zoom out", zoom(2)), button("Whole log", "Show the whole log", (a, b, first, end) => [first, end]), clock),
    strips.map((strip, k) => [
      h("ul", { class: "legend" }, h("li", { class: "strip-title" }, withUnit(strip.title, strip.unit && `(${strip.unit})`)),
        strip.series.map(({ name, kind }, j) => h("li", {}, h("span", { class: `sample ${kind}`, "aria-hidden": "true" }), name, outputs[k][j]))),
      holders[k],
    ]), h("p", { class: "axis-note" }, "Time from the first sample, s. Drag across a strip to zoom; double-click for the whole log."));

  const dark = matchMedia("(prefers-color-scheme: dark)");
  const repaint = () => {
    if (box.isConnected) return charts.forEach((c) => c.redraw(false));
    dark.removeEventListener("change", repaint);
    removeEventListener("repaint", repaint);
    return null;
  };
  new ResizeObserver(([entry]) => {
    const width = Math.round(entry.contentRect.width);
    if (!box.isConnected || width < 40) return;
    if (charts.length) charts.forEach((c, k) => c.setSize({ width, height: strips[k].height }));
    else {
      charts = strips.map((strip, k) => chart(strip, time, width, k === strips.length - 1, group, read, follow));
      charts.forEach((c, k) => holders[k].append(c.root));
    }
  }).observe(box);
  dark.addEventListener("change", repaint);
  addEventListener("repaint", repaint);
  return box;
}
