// The loop transfer function in the complex plane, equal scales on both axes, with the circle that Ms must keep out of.

import { line, plot } from "/page/charts/plot.js";
import { s } from "/page/dom.js";
import { exact } from "/page/format.js";

const VIEW = { x: [-2.1, 0.9], y: [-1.9, 0.9] };

/** loci: [{name, mark, real, imag, peak: {real, imag, Ms} or null}]; target: Ms or null. */
export function nyquist(width, loci, target, describe) {
  const wide = Math.min(width, 560);
  const margin = { top: 24, right: 12, bottom: 40, left: 46 };
  const scale = (wide - margin.left - margin.right) / (VIEW.x[1] - VIEW.x[0]);
  const height = scale * (VIEW.y[1] - VIEW.y[0]) + margin.top + margin.bottom;
  const { node, X, Y, area } = plot({
    width: wide, height, margin, title: "Loop transfer function in the complex plane", describe,
    x: { domain: VIEW.x, label: "Real part", count: 6 }, y: { domain: VIEW.y, label: "Imaginary part", count: 5 },
  });
  node.classList.add("square");
  area.append(s("circle", { class: "unit-circle", cx: X(0), cy: Y(0), r: scale }));
  if (target) {
    area.append(s("circle", { class: "forbidden", cx: X(-1), cy: Y(0), r: scale / target }),
      s("text", { class: "tick", x: X(-1), y: Y(0) + scale / target - 12, "text-anchor": "middle" }, `Ms = ${exact(target)}`));
  }
  for (const locus of [...loci].reverse()) area.append(line(X, Y, locus.real, locus.imag, { class: locus.mark }));
  for (const { peak } of loci) {
    if (peak) area.append(s("circle", { class: "mark", cx: X(peak.real), cy: Y(peak.imag), r: 4 }));
  }
  area.append(s("path", { class: "critical", d: `M${X(-1) - 5} ${Y(0)}h10M${X(-1)} ${Y(0) - 5}v10` }),
    s("text", { class: "tick", x: X(-1) + 8, y: Y(0) + 15 }, "−1"));
  return node;
}
