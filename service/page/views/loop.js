// One loop: its verdict, its nights over time, the choice of a baseline, a place for the next log.

import { h, section } from "/page/dom.js";
import { analysisAddress, settingsAddress } from "/page/views/addresses.js";
import { nightCharts } from "/page/views/night_charts.js";
import { nightTable } from "/page/views/night_table.js";
import { day, verdict } from "/page/views/verdict.js";

function upload(onLogs) {
  const input = h("input", { id: "night", class: "unseen", type: "file", multiple: true, accept: ".csv,.txt,.tsv,.log,text/csv,text/plain", "data-testid": "night-file",
    onchange: (event) => event.target.files.length && onLogs([...event.target.files]) });
  const zone = h("div", { class: "drop slim", "data-testid": "night-drop" },
    h("p", { class: "drop-or" }, h("span", {}, "Drop one or more logs of this loop here"), input, h("label", { class: "button", for: "night" }, "Choose files")));
  const lit = (on) => (event) => { event.preventDefault(); zone.classList.toggle("lit", on); };
  zone.addEventListener("dragenter", lit(true));
  zone.addEventListener("dragover", lit(true));
  zone.addEventListener("dragleave", lit(false));
  zone.addEventListener("drop", (event) => { lit(false)(event); if (event.dataTransfer.files.length) onLogs([...event.dataTransfer.files]); });
  return section("bring", "Bring logs", "They are read with the loop’s settings. The same log twice counts once.", zone);
}

function underWay(logs, onAgain) {
  const all = logs.items.flatMap(({ analyses, received }) => analyses.map((one) => ({ ...one, received })));
  const open = all.filter(({ status }) => status === "queued" || status === "running");
  const failed = all.filter(({ status }) => status === "failed");
  return [
    open.length > 0 && h("p", { class: "notice", "data-testid": "under-way" }, `${open.length === 1 ? "One log is" : `${open.length} logs are`} still being worked on. `,
      h("button", { class: "tool", type: "button", onclick: onAgain }, "Look again")),
    failed.length > 0 && section("failed", "Logs without a report", "They are kept. Set what could not be told, then send the log again.",
      h("ul", { class: "plain failures" }, failed.map(({ id, received, problem }) => h("li", {}, h("a", { href: analysisAddress(id) }, `Received ${day(received)}`), `: ${problem?.detail ?? "no reason given"}`)))),
  ];
}

function watching(loop, history, drift) {
  if (drift?.problem) return h("p", { class: "notice", "data-testid": "drift-problem" }, `There is no verdict. ${drift.problem.message}`);
  if (drift) return verdict(drift, loop.watch.significance);
  if (!history.items?.length) return null;
  return h("section", { class: "card", "data-testid": "no-baseline" }, h("p", { class: "eyebrow" }, "Watching"), h("h2", {}, "No baseline is chosen"),
    h("p", {}, "Whether the loop has moved is asked against nights on which it was as it should be. Mark some below, ", h("a", { href: "#nights" }, "in the table of nights"),
      ". Several say more than one: how much they differ among themselves counts as ordinary."));
}

/** history, logs: {items, more} or {problem}; drift: as told, null without a baseline, or {problem}. */
export function loopView({ loop, history, logs, drift }, { onReport, onBaseline, onLogs, onAgain }) {
  const rows = history.items ?? [];
  const told = drift?.problem ? null : drift;
  const [open, failed] = logs.items ? underWay(logs, onAgain) : [];
  return h("article", { class: "report", "data-testid": "loop" },
    h("header", { class: "report-head" },
      h("div", {}, h("p", { class: "eyebrow" }, "Loop"), h("h1", {}, loop.loop),
        h("p", { class: "note" }, `${loop.logs === 1 ? "One log" : `${loop.logs} logs`} kept. `, loop.installed ? "" : ["The installed settings are not told: ", h("a", { href: settingsAddress(loop.loop) }, "set them"), rows.some(({ margins_of }) => margins_of === "log") ? "; until then the margins are those of the controller that the logs show." : ", and their margins are followed too."])),
      h("div", { class: "actions" }, h("a", { class: "button quiet", href: "#bring" }, "Bring logs"), h("a", { class: "button quiet", href: settingsAddress(loop.loop), "data-testid": "to-settings" }, "Settings"))),
    open, history.problem && h("p", { class: "notice" }, `The history cannot be told. ${history.problem.message}`),
    rows.length === 0 && !history.problem && h("section", { class: "card", "data-testid": "no-nights" }, h("h2", {}, "No reports yet"),
      h("p", {}, "With the first log this place shows the loop’s parameters with their intervals, the quality of the fit and the margins, night by night.")),
    watching(loop, history, drift),
    rows.length > 0 && [nightCharts(rows, told, loop, onReport), nightTable(rows, told, loop, onBaseline)],
    (history.more || logs.more) && h("p", { class: "notice" }, "The loop has more nights than this page draws; the first ones are shown."),
    failed, upload(onLogs));
}
