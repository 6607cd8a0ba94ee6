// Two small plots: residual autocorrelation as stems, and a likelihood profile along one parameter.

import { line, plot } from "/page/charts/plot.js";
import { extent } from "/page/charts/scale.js";
import { s } from "/page/dom.js";

/** {lag, value, bound}: stems, the band in which white noise stays 19 times out of 20. */
export function autocorrelation(width, { lag, value, bound }, describe) {
  const [low, high] = extent([value], 0.1, [-1.6 * bound, 1.6 * bound]);
  const { node, X, Y, area } = plot({
    width, height: 220, title: "Autocorrelation of the residuals", describe, margin: { top: 28 },
    x: { domain: [0, lag[lag.length - 1] + 1], label: "Lag, samples" }, y: { domain: [Math.max(low, -1.05), Math.min(high, 1.05)], label: "Autocorrelation" },
  });
  area.append(s("rect", { class: "band", x: X(0), width: X(lag[lag.length - 1] + 1) - X(0), y: Y(bound), height: Y(-bound) - Y(bound) }));
  lag.forEach((k, i) => {
    const outside = Math.abs(value[i]) > bound;
    area.append(s("line", { class: outside ? "stem outside" : "stem", x1: X(k), x2: X(k), y1: Y(0), y2: Y(value[i]) }),
      // Outside the band: filled; inside: open. Shape says it without colour.
      s("circle", { class: outside ? "stem-head outside" : "stem-head", cx: X(k), cy: Y(value[i]), r: 3 }));
  });
  return node;
}

/** Where the valley is: points whose ratio stays within sight of the limit, and one more on each side. */
function valley(ratio, limit) {
  const sight = 1 + 30 * (limit - 1);
  const inside = ratio.flatMap((r, i) => (r <= sight ? [i] : []));
  return [Math.max(0, inside[0] - 1), Math.min(ratio.length, inside[inside.length - 1] + 2), sight];
}

/** {parameter, value, ratio, limit, unit} with the estimate and its interval marked. */
export function profile(width, curve, estimate, describe) {
  const { parameter, limit, unit } = curve;
  const [from, to, sight] = valley(curve.ratio, limit);
  const [value, ratio] = [curve.value.slice(from, to), curve.ratio.slice(from, to)];
  const top = Math.min(Math.max(...ratio, limit), sight);
  const { node, X, Y, area } = plot({
    width, height: 220, title: `Misfit along ${parameter}`, describe, margin: { top: 28 },
    x: { domain: [value[0], value[value.length - 1]], label: `${parameter}, ${unit}` },
    y: { domain: [1 - 0.05 * (top - 1 || 1), 1 + 1.05 * (top - 1 || 1)], label: "Sum of squared residuals / its least" },
  });
  const [low, high] = estimate?.ci95 ?? [null, null];
  const bottom = Y(1 - 0.05 * (top - 1 || 1));
  if (low !== null && high !== null) area.append(s("rect", { class: "band", x: X(low), width: Math.max(1, X(high) - X(low)), y: 0, height: bottom }));
  if (estimate) area.append(s("line", { class: "line other", x1: X(estimate.value), x2: X(estimate.value), y1: 0, y2: bottom }));
  area.append(s("line", { class: "line limit", x1: X(value[0]), x2: X(value[value.length - 1]), y1: Y(limit), y2: Y(limit) }),
    line(X, Y, value, ratio, { class: "line best" }));
  return node;
}
