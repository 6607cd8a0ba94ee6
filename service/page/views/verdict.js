// Whether a loop has moved, in plain words, with the figures behind it.

import { expression, h, table } from "/page/dom.js";
import { exact, fixed, probability, significant } from "/page/format.js";
import { reportAddress } from "/page/views/addresses.js";

const MARKS = { moved: ["poor", "◆ moved"], "not-moved": ["fine", "● not moved"], "no-news": ["none", "✕ no news"] };

/** "2026-11-28" of an RFC 3339 time. */
export const day = (text) => text.slice(0, 10);

export function verdictMark({ verdict, as_of }) {
  if (as_of === null) return h("span", { class: "verdict none" }, "nothing to compare yet");
  const [mood, text] = MARKS[verdict];
  return h("span", { class: `verdict ${mood}` }, text);
}

/** The last night that had news, or nothing. */
export function lastNews({ nights }) {
  return nights.findLast(({ verdict }) => verdict !== "no-news");
}

function standing(drift) {
  const last = lastNews(drift);
  if (!last) return "No log since the baseline had news.";
  const said = last.verdict === "moved" ? `the loop had moved${drift.since ? ` (since ${day(drift.since)})` : ""}` : "the loop had not moved";
  return h("strong", {}, `What stands is the log of ${day(last.at)}: ${said}.`);
}

function words(drift) {
  const { verdict, as_of, since, nights } = drift;
  if (as_of === null) {
    return ["Nothing to compare yet", "No log stands behind the baseline in time. The verdict begins with the next one."];
  }
  if (verdict === "moved") {
    return ["The loop has moved", `Since ${day(since)} its logs differ from the baseline by more than chance allows, and by more than the least change that counts.`];
  }
  if (verdict === "not-moved") {
    return ["The loop has not moved", "The last log would have shown a change worth knowing of, and shows none."];
  }
  const why = nights[nights.length - 1]?.unusable;
  return ["The last log brings no news", ["Too little happened in it, or its numbers are too uncertain, to tell whether the loop has moved. That is not the same as “not moved”. ",
    why && `${why} `, standing(drift)]];
}

function change({ change: by, baseline }) {
  if (by === null) return "–";
  const share = baseline ? ` (${by > 0 ? "+" : ""}${fixed((100 * by) / Math.abs(baseline), 0)} %)` : "";
  return [significant(by, 3), share];
}

function parameters(drift) {
  const head = ["Parameter", "Verdict", "Since", "Baseline", "Last log", "Change", "Least that counts", "Least this log could show", "Statistic, held to"];
  const rows = Object.entries(drift.parameters).map(([name, one]) => ({
    attributes: { "data-testid": `drift-${name}` },
    cells: [[expression(name), h("span", { class: "unit" }, one.unit)], verdictMark({ ...one, as_of: drift.as_of }), one.since ? day(one.since) : "–",
      significant(one.baseline), significant(one.now), change(one), significant(one.practical, 2), significant(one.visible, 2), one.statistic === null ? "–" : `${significant(one.statistic, 3)}, ${significant(one.threshold, 3)}`],
  }));
  return [table("Each parameter against the baseline", head, rows, { class: "stack drift" }),
    h("p", { class: "axis-note" }, "Statistic: the squared change over its variance. A parameter has moved when that exceeds what it is held to and the change is at least one that counts.")];
}

function range([low, high]) {
  if (low === null && high === null) return "no bound from this log";
  if (high === null) return `${fixed(low, 2)} or more, up to instability`;
  if (low === null) return `up to ${fixed(high, 2)}`;
  return `${fixed(low, 2)} to ${fixed(high, 2)}`;
}

const WHOSE = {
  installed: "The installed settings",
  log: "None are told as installed; the settings that the logs show in the machine",
  baseline: "The settings proposed for the baseline (none are told as installed, and no log shows them)",
};

function margin({ Ms_baseline, Ms_now, ci95, target, unstable_share, settings, settings_from, seen_in }) {
  // A told number is shown as it was told.
  const number = settings_from === "installed" ? exact : (value) => significant(value, 4);
  const state = Ms_now === null ? "no Ms can be told from the last log" : Ms_now <= target ? "within the target" : "beyond the target";
  return h("div", { class: "margin-now", "data-testid": "margin-now" },
    h("h3", {}, "What robustness is left"),
    h("dl", { class: "margins" },
      [["Ms on the baseline’s plant", fixed(Ms_baseline, 3)], ["Ms on the last log’s plant", fixed(Ms_now, 3)], ["95 % interval", Ms_now === null ? "–" : range(ci95)], ["Target", exact(target)]]
        .map(([label, text]) => h("div", {}, h("dt", {}, label), h("dd", {}, text)))),
    h("p", { class: "note" }, WHOSE[settings_from], seen_in && [" (", h("a", { href: reportAddress(seen_in) }, "latest log"), ")"], `, Kp ${number(settings.Kp)}, Ti ${number(settings.Ti)} s${settings.Td ? `, Td ${number(settings.Td)} s` : ""}: `, h("strong", {}, state), ". ",
      unstable_share ? `With ${fixed(100 * unstable_share, 1)} % of the plants that the log allows the loop is unstable. ` : "",
      "A smaller Ms is farther from instability; it says nothing about speed."));
}

/** drift: as the service tells it; significance: false alarms per unchanged night. */
export function verdict(drift, significance) {
  const [title, said] = words(drift);
  const joint = drift.statistic !== null && `All parameters together: ${significant(drift.statistic, 4)}, held to ${significant(drift.threshold, 4)}, which an unchanged loop exceeds on ${exact(100 * significance)} % of nights (p ${probability(drift.p).startsWith("<") ? "" : "= "}${probability(drift.p)}).`;
  const mood = drift.as_of === null ? "none" : MARKS[drift.verdict][0];
  return h("section", { class: `card verdict-card ${mood}`, "data-testid": "verdict", "data-verdict": drift.verdict },
    h("p", { class: "eyebrow" }, drift.as_of ? `As of ${day(drift.as_of)}` : "Watching"),
    h("h2", {}, title), h("p", { class: "lead" }, said),
    joint && h("p", { class: "note" }, joint),
    drift.as_of !== null && parameters(drift),
    drift.findings.map((one) => h("p", { class: "notice", "data-testid": `finding-${one.code}` }, one.message)),
    drift.margin && margin(drift.margin));
}
