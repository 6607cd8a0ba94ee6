// The log as it was read, and what was asked of it.

import { h, section } from "/page/dom.js";
import { duration, exact, instant, significant, withUnit } from "/page/format.js";
import { FORMS, GOALS, OPERATIONS, ROLES, word } from "/page/report/words.js";

function spans(list) {
  return h("ul", { class: "plain" }, list.map(({ start_s, end_s, rows, note }) =>
    h("li", {}, `${significant(start_s, 5)} to ${withUnit(significant(end_s, 5), "s")}, ${rows} rows${note && `: ${note}`}`)));
}

const ASKED = { Ms: "target Ms", form: "controller", goal: "aim", hold: "command between samples", period: "controller period (s)", compute_delay: "computing delay (s)", robust: "held on 95 % of the plants", seed: "seed of the draws" };
const MEANT = { form: FORMS, goal: Object.fromEntries(Object.entries(GOALS).map(([key, text]) => [key, text.toLowerCase()])) };

function asked(options) {
  return Object.entries(options).filter(([, value]) => value !== null && value !== "")
    .map(([key, value]) => `${word(ASKED, key)} ${typeof value === "number" ? exact(value) : word(MEANT[key] ?? {}, value)}`).join(", ");
}

export function log(report, name) {
  const { log: read, record, options } = report;
  const facts = [
    name && ["File", name],
    ["Rows", String(read.rows)],
    ["Start", instant(read.start) ?? "no absolute time in the log"],
    ["End", instant(read.end)],
    ["Duration", duration(read.duration_s)],
    ["Sample time", read.sample_time_s === null ? "uneven" : withUnit(exact(read.sample_time_s), "s")],
    ["Operation", word(OPERATIONS, record.operation)],
    (record.operations ?? []).length > 1 && ["Part by part", spans(record.operations.map((one) => ({ ...one, note: word(OPERATIONS, one.note).toLowerCase() })))],
    record.excitation.sufficient && ["Movement", record.excitation.reason],
    ["Columns", h("ul", { class: "plain" }, Object.entries(read.columns).map(([role, header]) => h("li", {}, `${word(ROLES, role)}: “${header}”`)))],
    ["Units", `speed ${read.speed_unit || "not stated"}, command ${read.command_unit || "not stated"}`],
    record.segments.length > 1 && ["Segments", spans(record.segments)],
    record.excluded.length > 0 && ["Left out", spans(record.excluded)],
    ["Asked for", asked(options)],
    read.sha256 && ["SHA-256", h("code", { class: "hash" }, read.sha256)],
    ["Program", `gainwright ${report.engine_version}, report format ${report.report_version}`],
  ].filter((fact) => fact && fact[1]);
  return section("log", "The log as read", null,
    h("dl", { class: "facts" }, facts.map(([label, value]) => h("div", {}, h("dt", {}, label), h("dd", {}, value)))));
}
