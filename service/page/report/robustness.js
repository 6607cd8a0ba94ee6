// How far each loop stays from the critical point.

import { dataTable } from "/page/charts/data_table.js";
import { legend } from "/page/charts/legend.js";
import { nyquist } from "/page/charts/nyquist.js";
import { responsive } from "/page/charts/plot.js";
import { h, section } from "/page/dom.js";
import { exact, fixed, significant } from "/page/format.js";
import { lineOf, METHODS, word } from "/page/report/words.js";

function closest({ w, real, imag, sensitivity }) {
  const i = sensitivity.indexOf(Math.max(...sensitivity));
  return { w: w[i], real: real[i], imag: imag[i], Ms: sensitivity[i] };
}

/** Up to the frequency beyond which the loop only spirals into 0, too small to see. */
function visible({ real, imag }) {
  let last = real.length;
  while (last > 1 && Math.hypot(real[last - 1], imag[last - 1]) < 0.03) last -= 1;
  return { real: real.slice(0, last), imag: imag.slice(0, last) };
}

export function robustness(report) {
  const order = (i) => (i === report.recommended ? -1 : i);
  const loci = report.curves.loci
    .map((one) => ({ ...one, name: word(METHODS, report.tunings[one.tuning].method), mark: lineOf(one.tuning, report.recommended), peak: closest(one) }))
    .sort((a, b) => order(a.tuning) - order(b.tuning));
  const { installed } = report.curves;
  if (installed) loci.push({ ...installed, name: "Installed", mark: "line installed", peak: report.installed.margins?.stable ? closest(installed) : null });
  if (!loci.length) return null;
  const target = typeof report.options.Ms === "number" ? report.options.Ms : null;
  const said = loci.map(({ name, peak }) => (peak
    ? `${name}: closest to −1 at ${significant(peak.w, 3)} rad/s, where the sensitivity is ${fixed(peak.Ms, 2)}.` : `${name}: unstable on this plant.`)).join(" ");
  return section("robustness", "Robustness", "The loop transfer function from low frequencies (far out) to high (towards 0). A loop that keeps outside the shaded circle around −1 keeps the target.",
    legend([...loci, { name: "closest to −1", mark: "dot" }, target && { name: `target, Ms = ${exact(target)}`, mark: "forbidden" }].filter(Boolean)),
    h("p", { class: "note" }, said),
    responsive((width) => nyquist(width, loci.map((one) => ({ ...one, ...visible(one) })), target, said)),
    loci.map(({ name, w, real, imag, sensitivity }) =>
      dataTable(`Loop transfer function: ${name}`, [["Frequency, rad/s", w], ["Real part", real], ["Imaginary part", imag], ["Sensitivity", sensitivity]], name)));
}
