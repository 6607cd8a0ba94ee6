// Another target for a kept fit: what is asked, and the proposals it gives beside the report's own.

import { h, section, symbol, table } from "/page/dom.js";
import { exact, per, significant } from "/page/format.js";
import { marginCells } from "/page/report/tunings.js";
import { scaleFields, scaleOf } from "/page/report/card.js";
import { realised } from "/page/report/to_set.js";
import { FORMS, GOALS, METHODS, word } from "/page/report/words.js";
import { field, given } from "/page/views/fields.js";

function line(name, { settings: set, margins }, pid, hook) {
  return { attributes: { "data-testid": hook }, cells: [name, significant(set.Kp), significant(set.Ti), ...(pid ? [significant(set.Td), significant(set.Tf)] : []), significant(set.b, 3), ...marginCells(margins)] };
}

function asked({ Ms, form, goal }) {
  return `Ms ${exact(Ms)}, ${word(FORMS, form)}, ${word(GOALS, goal).toLowerCase()}`;
}

function beside(report, told) {
  const gain = per(report.log.command_unit, report.log.speed_unit);
  const before = report.recommended === null ? null : report.tunings[report.recommended];
  const pid = [...told.tunings, ...(before ? [before] : [])].some(({ settings }) => settings.Td > 0);
  const head = ["Proposal", [symbol("Kp"), gain && ` (${gain})`], [symbol("Ti"), " (s)"], ...(pid ? [[symbol("Td"), " (s)"], [symbol("Tf"), " (s)"]] : []), symbol("b"),
    symbol("Ms"), symbol("Mt"), "Gain margin", "Phase margin", "Delay margin"];
  const own = before ? [line(`In this report: ${asked(report.options)}`, before, pid, "retuned-before")] : [];
  const best = told.recommended;
  const order = told.tunings.map((_, i) => i).sort((a, b) => (b === best) - (a === best) || a - b);
  const rows = order.map((i) => line(
    [`${asked(told.options)}: ${word(METHODS, told.tunings[i].method)}`, i === best && [" ", h("span", { class: "badge" }, "recommended")]], told.tunings[i], pid, `retuned-${i === best ? "best" : i}`));
  return [
    table("The report's proposal and the new ones", head, [...own, ...rows], { class: "stack" }),
    h("p", { class: "note" }, told.recommended_because),
    best !== null && told.tunings[best].realisations && h("div", { "data-testid": "retuned-to-set" }, h("h3", {}, "What to set"), realised(told.tunings[best].realisations, report.log)),
    told.tunings.flatMap(({ method, findings }) => findings.map((one) => h("p", { class: "note" }, `${word(METHODS, method)}: ${one.message}`))),
  ];
}

/** asked: what the address asks for; ask(wanted) -> proposals; onAsked(wanted): they are on screen. */
export function another(report, preset, { ask, onAsked }) {
  const output = h("div", { "aria-live": "polite", "data-testid": "retuned" });
  const button = h("button", { class: "button", type: "submit" }, "Propose");
  const form = h("form", { class: "options", "data-testid": "another", onsubmit: (event) => { event.preventDefault(); propose(); } },
    field("Ms", "Target Ms", null, { type: "number", min: "1.01", max: "5", step: "any", required: true, value: preset.Ms ?? report.options.Ms }),
    field("form", "Controller", null, { value: preset.form ?? report.options.form }, Object.entries(FORMS)),
    field("goal", "Aim", null, { value: preset.goal ?? report.options.goal }, Object.entries(GOALS)),
    field("period", "Controller period, s", null, { type: "number", min: "0", step: "any", placeholder: "as in the report", value: preset.period ?? "" }),
    field("kind", "Carried out as", null, { value: preset.kind ?? "digital" }, [["digital", "Panel or program"], ["analogue", "Op-amp card"]]),
    h("details", { class: "fold wide" }, h("summary", {}, "Spans, word length, card"),
      h("div", { class: "options" },
        field("speed_span", "Span of the speed scale", null, { type: "number", min: "0", step: "any", value: preset.speed_span ?? "" }),
        field("command_span", "Span of the command scale", null, { type: "number", min: "0", step: "any", value: preset.command_span ?? "" }),
        field("bits", "Word length, bits", null, { type: "number", min: "8", max: "32", step: "1", placeholder: "none", value: preset.bits ?? "" }),
        scaleFields(preset, "option"))),
    h("div", { class: "submit" }, button));

  async function propose() {
    const texts = given(form);
    const { Ms, form: controller, goal, kind } = texts;
    const numbers = Object.fromEntries(["speed_span", "command_span", "bits"].filter((name) => name in texts).map((name) => [name, Number(texts[name])]));
    const wanted = { Ms: Number(Ms), form: controller, goal, ...("period" in texts && { period: Number(texts.period) }),
      realisation: kind === "analogue" ? { kind, ...scaleOf(texts) } : { kind, ...numbers } };
    button.disabled = true;
    try {
      output.replaceChildren(...[beside(report, await ask(wanted))].flat(2).filter(Boolean));
      onAsked(texts);
    } catch (error) {
      if (error.name !== "AbortError") output.replaceChildren(h("p", { class: "notice", role: "alert" }, error.message));
    } finally {
      button.disabled = false;
    }
  }

  if (preset.Ms) propose();
  return section("another", "Another target", "From the same kept fit, without fitting again. Nothing is stored; the address above keeps what you asked.", form, output);
}
