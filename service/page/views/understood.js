// How a log is understood, asked before anything is made of it: "is this right?"

import { h, section, table } from "/page/dom.js";
import { duration, exact, instant, significant, withUnit } from "/page/format.js";
import { findings } from "/page/report/findings.js";
import { ROLES, word } from "/page/report/words.js";
import { readingFields } from "/page/views/options.js";

const LAYOUTS = { wide: "one row a moment", long: "one row a value", paired: "a time beside each value" };
const HEAD = ["Taken as", "Column in the log", "Because", "Unit", "From", "To"];

const rows = (columns) => columns.map(({ role, header, why, unit, lowest, highest }) => [
  word(ROLES, role), `“${header}”`, why, unit || "not stated", lowest === null ? "" : significant(lowest), highest === null ? "" : significant(highest)]);

function facts(seen) {
  const left = Object.entries(seen.dropped).map(([reason, count]) => `${count} (${reason})`).join(", ");
  return [
    ["Rows", `${seen.rows}, ${seen.rows_used === seen.rows ? "all" : `${seen.rows_used} of them`} to be used`],
    left && ["Left out", left],
    ["First stamp", seen.first_stamp], ["Last stamp", seen.last_stamp],
    ["Start", instant(seen.start) ?? "no absolute time: give the zone of the stamps if they have one"],
    ["Duration", duration(seen.duration_s)],
    ["Sample time", seen.sample_time_s === null ? `uneven; half of the steps are below ${withUnit(significant(seen.median_step_s, 3), "s")}` : withUnit(exact(seen.sample_time_s), "s")],
    seen.gap_count > 0 && ["Gaps", `${seen.gap_count}; the longest ${withUnit(significant(Math.max(...seen.gaps.map((gap) => gap.length_s)), 3), "s")}`],
    seen.clock_step_count > 0 && ["Clock set back", seen.clock_step_count === 1 ? "once" : `${seen.clock_step_count} times`],
    ["Written as", `${LAYOUTS[seen.layout] ?? seen.layout}, ${seen.encoding}, decimal ${seen.decimal === "," ? "comma" : "point"}`],
  ].filter(Boolean);
}

/** onRight() goes on; onAgain(form) reads it again with what the form says. */
export function understood(seen, { name, loop, options, onRight, onAgain }) {
  return h("article", { class: "sheet", "data-testid": "understood" },
    h("p", { class: "eyebrow" }, loop ? `For the loop ${loop}` : "Before the log is used"),
    h("h1", {}, `Is ${name} read right?`),
    h("p", { class: "actions" },
      h("button", { class: "button", type: "button", "data-testid": "right", onclick: onRight }, "Yes, go on"),
      h("a", { class: "button quiet", href: "#/" }, "No, bring another")),
    section("columns", "Columns", "What each column was taken for, and its smallest and largest value.",
      table("Columns as understood", HEAD, rows(seen.columns), { class: "stack" })),
    seen.findings.length > 0 && findings({ findings: [], log: { findings: seen.findings }, fits: [], tunings: [], selected: null }),
    section("reading", "Times and rows", null,
      h("dl", { class: "facts" }, facts(seen).map(([label, value]) => h("div", {}, h("dt", {}, label), h("dd", {}, value))))),
    section("otherwise", "Read it otherwise", loop ? "What is named here is kept with the loop once you go on." : null,
      h("form", { "data-testid": "otherwise", onsubmit: (event) => { event.preventDefault(); onAgain(event.target); } },
        readingFields(options), h("button", { class: "button quiet", type: "submit" }, "Read it again"))));
}
