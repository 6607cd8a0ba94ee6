// What the log says and what to set, before anything else.

import { expression, h, symbol } from "/page/dom.js";
import { estimate, exact, fixed, interval, per, significant, withUnit } from "/page/format.js";
import { formula, METHODS, MODELS, PARAMETERS, word } from "/page/report/words.js";

function quantity(name, { value, unit, ci95, std }) {
  const shown = estimate({ value, ci95, std });
  return h("div", { class: "quantity" },
    h("dt", {}, symbol(name), h("span", { class: "gloss" }, word(PARAMETERS, name).toLowerCase())),
    h("dd", {}, h("data", { value, "data-testid": `headline-${name}` }, shown.value), h("span", { class: "unit" }, unit === "1" ? "" : unit),
      h("p", { class: "ci" }, "95 %: ", interval(shown))));
}

/** What comes after the dead time, by the parameters that the model has. */
function answer({ T, T1, T2, zeta, w0 }) {
  if (T) return `then 63 % of the change comes within ${withUnit(estimate(T).value, "s")}`;
  if (T1) return `then the speed follows through two lags of ${withUnit(estimate(T1).value, "s")} and ${withUnit(estimate(T2).value, "s")}`;
  const overshoot = 100 * Math.exp((-Math.PI * zeta.value) / Math.sqrt(1 - zeta.value ** 2));
  if (overshoot < 0.5) return "then the speed follows through a second-order lag that hardly overshoots";
  const peak = Math.PI / (w0.value * Math.sqrt(1 - zeta.value ** 2));
  return `then the speed swings past its end value by ${withUnit(fixed(overshoot, 0), "%")}, ${withUnit(significant(peak, 3), "s")} later`;
}

function sentence(fit, log) {
  const { K, L, ...rest } = fit.parameters;
  if (!K || !L || !(rest.T || rest.T1 || rest.zeta)) return null;
  const unit = log.command_unit ? `1 ${log.command_unit}` : "One unit";
  return `${unit} more command changes the speed by ${withUnit(estimate(K).value, log.speed_unit)} in the end. Nothing happens for ${withUnit(estimate(L).value, "s")}; ${answer(rest)}.`;
}

function setting(name, value, unit, gloss, digits = 4) {
  return h("div", { class: "setting" },
    h("dt", {}, symbol(name), h("span", { class: "gloss" }, gloss)),
    h("dd", {}, h("data", { value, "data-testid": `setting-${name}` }, significant(value, digits)), h("span", { class: "unit" }, unit)));
}

/** Settings as one would note them down, with plain minus signs and points, for the clipboard. */
function plain({ Kp, Ti, Td, Tf, b }, gainUnit) {
  const seconds = (name, value) => `${name} = ${Number(value.toPrecision(4))} s`;
  return [`Kp = ${Number(Kp.toPrecision(4))} ${gainUnit}`.trim(), seconds("Ti", Ti), ...(Td > 0 ? [seconds("Td", Td), seconds("Tf", Tf)] : []), `b = ${Number(b.toPrecision(4))}`].join("\n");
}

function copyButton(text) {
  if (!navigator.clipboard) return null;
  return h("button", { type: "button", class: "tool", onclick: async ({ target }) => {
    const copied = await navigator.clipboard.writeText(text).then(() => true, () => false);
    target.textContent = copied ? "Copied" : "Copying is not allowed here";
  } }, "Copy the settings");
}

function model(report) {
  const fit = report.fits[report.selected];
  return h("section", { class: "card", "aria-labelledby": "model-title" },
    h("p", { class: "eyebrow" }, "The model"),
    h("h2", { id: "model-title", "data-testid": "model" }, word(MODELS, fit.model)),
    formula(fit) && h("p", { class: "formula", "data-testid": "formula" }, expression(formula(fit))),
    h("dl", { class: "quantities" }, Object.entries(fit.parameters).map(([name, one]) => quantity(name, one))),
    h("p", {}, sentence(fit, report.log)),
    report.selected_because && h("p", { class: "note" }, report.selected_because));
}

function margin(label, text, id) {
  return h("div", {}, h("dt", {}, label), h("dd", { "data-testid": `margin-${id}` }, text));
}

function settings(report) {
  const { settings: set, margins, form, method } = report.tunings[report.recommended];
  const gainUnit = per(report.log.command_unit, report.log.speed_unit);
  const target = report.options.Ms;
  return h("section", { class: "card chosen", "aria-labelledby": "settings-title" },
    h("p", { class: "eyebrow" }, `Recommended ${form.toUpperCase()} settings, ideal (ISA standard) form`),
    h("h2", { id: "settings-title" }, word(METHODS, method)),
    h("dl", { class: "settings" },
      setting("Kp", set.Kp, gainUnit, "gain"), setting("Ti", set.Ti, "s", "integral time"),
      set.Td > 0 && setting("Td", set.Td, "s", "derivative time"), set.Td > 0 && setting("Tf", set.Tf, "s", "filter time"),
      setting("b", set.b, "", "setpoint weight", 3)),
    h("dl", { class: "margins" },
      typeof target === "number" && margin(["Target ", symbol("Ms")], exact(target), "target"),
      margin([symbol("Ms"), " reached"], fixed(margins.Ms, 3), "Ms"), margin(symbol("Mt"), fixed(margins.Mt, 3), "Mt"),
      margin("Gain margin", margins.gain_margin === null ? "no limit" : `× ${significant(margins.gain_margin, 3)}`, "gain"),
      margin("Phase margin", withUnit(fixed(margins.phase_margin_deg, 1), "°"), "phase"),
      margin("Delay margin", withUnit(significant(margins.delay_margin_s, 3), "s"), "delay")),
    report.recommended_because && h("p", { class: "note", "data-testid": "because" }, report.recommended_because),
    h("p", { class: "after" }, copyButton(plain(set, gainUnit)), report.cautions.length > 0 && h("a", { href: "#cautions" }, "Read the cautions first")));
}

function nothing(report) {
  const { excitation, advice } = report.record;
  return h("section", { class: "card chosen", "data-testid": "nothing-to-learn" },
    h("p", { class: "eyebrow" }, "No model, no settings"),
    h("h2", {}, "There is nothing to learn from this log"),
    h("p", { class: "lead", "data-testid": "reason" }, excitation.reason),
    advice && [h("h3", {}, "The next test to run"), h("p", { "data-testid": "advice" }, advice.message)]);
}

function unadvised(report) {
  return h("section", { class: "card chosen", "data-testid": "no-settings" },
    h("p", { class: "eyebrow" }, "Settings"), h("h2", {}, "No settings are recommended"),
    h("p", {}, report.recommended_because || "The findings below say why."));
}

export function headline(report) {
  if (report.selected === null) return nothing(report);
  return h("div", { class: "cards" }, report.recommended === null ? unadvised(report) : settings(report), model(report));
}
