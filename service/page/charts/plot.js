// An SVG plot: frame, grid, ticks and labels, with the scales to draw into it. Text alternative required.

import { linear, ticks } from "/page/charts/scale.js";
import { h, s } from "/page/dom.js";
import { fixed } from "/page/format.js";

let serial = 0;

/**
 * {node, X, Y, area}: append marks to `area`, which is clipped to the frame.
 * x, y   {domain: [low, high], label, count}; for x also ticks: {values, text(value)} of its own
 * title, describe   what it shows, and what it says, in words
 */
export function plot({ width, height, x, y, title, describe, margin = {} }) {
  const room = { top: 10, right: 12, bottom: 40, left: 52, ...margin };
  const [right, bottom] = [width - room.right, height - room.bottom];
  const X = linear(x.domain, [room.left, right]);
  const Y = linear(y.domain, [bottom, room.top]);
  const id = `plot-${(serial += 1)}`;
  const across = x.ticks ?? ticks(x.domain, x.count ?? Math.max(3, Math.round(width / 90)));
  const up = ticks(y.domain, y.count ?? Math.max(3, Math.round(height / 50)));
  const area = s("g", { "clip-path": `url(#${id}-clip)` });
  const node = s("svg", { viewBox: `0 0 ${width} ${height}`, class: "plot", role: "img", "aria-labelledby": `${id}-title ${id}-desc` },
    s("title", { id: `${id}-title` }, title),
    s("desc", { id: `${id}-desc` }, describe),
    s("clipPath", { id: `${id}-clip` },
      s("rect", { x: room.left, y: room.top, width: right - room.left, height: bottom - room.top })),
    across.values.map((v) => s("line", { class: "grid", x1: X(v), x2: X(v), y1: room.top, y2: bottom })),
    up.values.map((v) => s("line", { class: v === 0 ? "grid zero" : "grid", x1: room.left, x2: right, y1: Y(v), y2: Y(v) })),
    area,
    across.values.map((v) => s("text", { class: "tick", x: X(v), y: bottom + 16, "text-anchor": "middle" }, across.text ? across.text(v) : fixed(v, across.decimals))),
    up.values.map((v) => s("text", { class: "tick", x: room.left - 8, y: Y(v) + 4, "text-anchor": "end" }, fixed(v, up.decimals))),
    x.label && s("text", { class: "axis", x: right, y: height - 6, "text-anchor": "end" }, x.label),
    y.label && s("text", { class: "axis", x: room.left, y: room.top - 12, "text-anchor": "start" }, y.label));
  return { node, X, Y, area };
}

/** A path through points; nulls break it. */
export function line(X, Y, xs, ys, attributes) {
  let pen = "M";
  const path = [];
  for (let i = 0; i < xs.length; i += 1) {
    if (ys[i] === null || xs[i] === null) {
      pen = "M";
      continue;
    }
    path.push(`${pen}${X(xs[i]).toFixed(1)} ${Y(ys[i]).toFixed(1)}`);
    pen = "L";
  }
  return s("path", { d: path.join(""), fill: "none", ...attributes });
}

/** A box that redraws `draw(width)` whenever its width changes, so that text keeps its size. */
export function responsive(draw, attributes = {}) {
  const box = h("div", { class: "chart", ...attributes });
  let drawn = 0;
  new ResizeObserver(([entry]) => {
    const width = Math.round(entry.contentRect.width);
    if (width < 40 || width === drawn) return;
    drawn = width;
    box.replaceChildren(draw(width));
  }).observe(box);
  return box;
}
