// Figures of many nights, one panel each over one time axis: intervals as bars, the baseline as a line with the band
// of changes that do not count. Pointing at a night, or stepping to it, reads it off in all panels.

import { calendar } from "/page/charts/calendar.js";
import { line, plot, responsive } from "/page/charts/plot.js";
import { h, s } from "/page/dom.js";
import { UNKNOWN } from "/page/format.js";

const HEIGHT = 210;
// Kinds differ in shape as well as in colour.
const SHAPES = {
  plain: (x, y) => s("circle", { class: "night", cx: x, cy: y, r: 4 }),
  baseline: (x, y) => s("rect", { class: "night baseline", x: x - 4, y: y - 4, width: 8, height: 8 }),
  moved: (x, y) => s("path", { class: "night moved", d: `M${x} ${y - 6}L${x + 6} ${y}L${x} ${y + 6}L${x - 6} ${y}Z` }),
  "no-news": (x, y) => s("path", { class: "night no-news", d: `M${x - 4} ${y - 4}L${x + 4} ${y + 4}M${x - 4} ${y + 4}L${x + 4} ${y - 4}` }),
};

export const KINDS = [["baseline", "baseline"], ["plain", "not moved, or not compared"], ["moved", "moved"], ["no-news", "no news"]];

export function sample(kind) {
  return s("svg", { viewBox: "0 0 16 16", width: 16, height: 16, "aria-hidden": "true" }, SHAPES[kind](8, 8));
}

const circle = (x, y) => s("circle", { class: "ring", cx: x, cy: y, r: 5.5 });

/** How a first-order fit beside a second-order one is drawn. */
export function ring() {
  return s("svg", { viewBox: "0 0 16 16", width: 16, height: 16, "aria-hidden": "true" }, circle(8, 8));
}

const middle = (list) => [...list].sort((a, b) => a - b)[Math.floor(list.length / 2)];

/** Room for all values; an interval far wider than the others runs out of the frame rather than flatten them. */
function domain({ values, beside, intervals, reference, limit }) {
  const known = [...values, ...beside].filter((v) => v !== null);
  const extra = [reference?.value, reference && reference.value - reference.practical, reference && reference.value + reference.practical, limit].filter(Number.isFinite);
  let [low, high] = [Math.min(...known, ...extra), Math.max(...known, ...extra)];
  const halves = intervals.flatMap((ci, i) => (ci && values[i] !== null ? ci.filter((end) => end !== null).map((end) => Math.abs(end - values[i])) : []));
  const reach = 4 * (middle(halves) ?? 0) + (high - low);
  const ends = intervals.flatMap((ci) => (ci ?? []).filter((end) => end !== null));
  low = Math.max(Math.min(low, ...ends), low - reach);
  high = Math.min(Math.max(high, ...ends), high + reach);
  const room = 0.08 * (high - low) || Math.abs(high) * 0.05 || 1;
  return [low - room, high + room];
}

function draw(width, times, kinds, panel) {
  const [first, last] = [Math.min(...times), Math.max(...times)];
  const room = 0.04 * (last - first) || 4.3e7;
  const x = [first - room, last + room];
  const { node, X, Y, area } = plot({
    width, height: HEIGHT, title: panel.title, describe: panel.describe, margin: { top: 12, bottom: 26, left: 56 },
    x: { domain: x, ticks: calendar(x, Math.max(2, Math.floor(width / 62))) }, y: { domain: domain(panel) },
  });
  const { values, beside, intervals, reference, limit } = panel;
  if (reference) {
    const { value, practical } = reference;
    area.append(s("rect", { class: "band", x: X(x[0]), width: X(x[1]) - X(x[0]), y: Y(value + practical), height: Y(value - practical) - Y(value + practical) }),
      line(X, Y, x, [value, value], { class: "line reference" }));
  }
  if (Number.isFinite(limit)) area.append(line(X, Y, x, [limit, limit], { class: "line limit" }));
  const [lowest, highest] = [HEIGHT, 0];
  const cursor = s("line", { class: "cursor", y1: 0, y2: HEIGHT });
  area.append(cursor, line(X, Y, times, values, { class: "line thread" }));
  beside.forEach((value, i) => {
    if (value !== null) area.append(circle(X(times[i]), Y(value)));
  });
  values.forEach((value, i) => {
    if (value === null) return;
    const at = X(times[i]);
    const [low, high] = intervals[i] ?? [value, value];
    // An end that the log leaves open runs out of the frame, without a cap.
    const [bottom, top] = [low === null ? lowest : Y(low), high === null ? highest : Y(high)];
    if (intervals[i]) {
      area.append(s("path", { class: "whisker", d: `M${at} ${bottom}V${top}${low === null ? "" : `M${at - 3} ${bottom}h6`}${high === null ? "" : `M${at - 3} ${top}h6`}` }));
    }
    area.append(SHAPES[kinds[i]](at, Y(value)));
  });
  const mark = (i) => {
    if (i === null) return cursor.classList.remove("on");
    cursor.classList.add("on");
    cursor.setAttribute("x1", X(times[i]));
    return cursor.setAttribute("x2", X(times[i]));
  };
  const nearest = (event) => {
    const box = node.getBoundingClientRect();
    const at = ((event.clientX - box.left) * width) / box.width;
    return times.reduce((best, t, i) => (Math.abs(X(t) - at) < Math.abs(X(times[best]) - at) ? i : best), 0);
  };
  return { node, mark, nearest };
}

/**
 * nights   [{at (ms), kind, name}]
 * panels   [{title, heading() -> nodes, unit, describe, values, beside, intervals, reference: {value, practical} or null, limit, text(i), note}]
 * onOpen(i)   a night was chosen
 */
export function historyCharts(nights, panels, onOpen) {
  const times = nights.map(({ at }) => at);
  const kinds = nights.map(({ kind }) => kind);
  const outputs = panels.map(() => h("output", { class: "figures" }));
  const which = h("output", { class: "figures", "aria-live": "polite", "data-testid": "night-name" });
  const open = h("button", { type: "button", class: "tool", hidden: true, onclick: () => onOpen(picked) }, "Open its report");
  const drawn = panels.map(() => null);
  let picked = null;

  function pick(i) {
    picked = i;
    drawn.forEach((one) => one?.mark(i));
    open.hidden = i === null;
    which.textContent = i === null ? "" : nights[i].name;
    panels.forEach((panel, k) => { outputs[k].textContent = i === null ? "" : panel.values[i] === null ? UNKNOWN : panel.text(i); });
  }
  const step = (by) => pick(Math.min(nights.length - 1, Math.max(0, picked === null ? nights.length - 1 : picked + by)));
  const keys = { ArrowLeft: () => step(-1), ArrowRight: () => step(1), Home: () => pick(0), End: () => pick(nights.length - 1), Escape: () => pick(null) };

  return h("div", {},
    h("div", { class: "tools", role: "group", "aria-label": "Step through the nights" },
      h("button", { type: "button", class: "tool", "aria-label": "Earlier night", title: "Earlier night", onclick: () => step(-1) }, "◂"),
      h("button", { type: "button", class: "tool", "aria-label": "Later night", title: "Later night", onclick: () => step(1) }, "▸"), open, which),
    h("div", { class: "pair panels", tabindex: "0", role: "group", "aria-label": "Charts of the nights; arrow keys step through them",
      onkeydown: (event) => { if (keys[event.key]) { event.preventDefault(); keys[event.key](); } else if (event.key === "Enter" && picked !== null) onOpen(picked); } },
    panels.map((panel, k) => h("div", { "data-testid": `panel-${panel.key}` },
      h("h3", { class: "panel-title" }, panel.heading(), panel.unit && h("span", { class: "unit" }, panel.unit), outputs[k]),
      panel.values.every((v) => v === null) ? h("p", { class: "note" }, panel.nothing)
        : responsive((width) => {
          drawn[k] = draw(width, times, kinds, panel);
          const { node, nearest, mark } = drawn[k];
          node.addEventListener("pointermove", (event) => pick(nearest(event)));
          node.addEventListener("click", (event) => { pick(nearest(event)); if (event.detail > 1) onOpen(picked); });
          mark(picked);
          return node;
        }),
      panel.note && h("p", { class: "axis-note" }, panel.note)))));
}
