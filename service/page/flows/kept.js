// A kept log: its analysis while it is under way, then its report at an address that stays.

import { analysis as fetchAnalysis, card as judgeCard, keptReport as fetchReport, Problem, retune } from "/page/api.js";
import { loopAddress } from "/page/views/addresses.js";
import { problem as problemView } from "/page/views/problem.js";
import { stages } from "/page/views/stages.js";
import { another } from "/page/report/another.js";
import { cardForm } from "/page/report/card.js";
import { report as reportView } from "/page/report/report.js";
import { instant } from "/page/format.js";

const pause = (ms, signal) => new Promise((resolve) => {
  const timer = setTimeout(resolve, ms);
  signal.addEventListener("abort", () => { clearTimeout(timer); resolve(); });
});

export async function analysis(visit, { id }) {
  const view = stages();
  let told = await fetchAnalysis(id, visit.signal);
  for (let wait = 250; told.status === "queued" || told.status === "running"; wait = Math.min(2000, wait * 1.3)) {
    if (!view.node.isConnected) visit.show(told.loop, "The log is kept and waits for its analysis", view.node);
    view.tell(told);
    await pause(wait, visit.signal);
    if (visit.signal.aborted) return;
    told = await fetchAnalysis(id, visit.signal);
  }
  if (told.report_id) visit.instead(`/reports/${told.report_id}`);
  else failed(visit, told);
}

function failed(visit, { loop, problem }) {
  const error = new Problem(problem ?? {});
  visit.show("No report", error.message, problemView(error, { name: `A log of ${loop}`, loop, advice: "The log is kept. Where its columns, zone or dates could not be told, set them for the loop and send the log again; otherwise mend the log." }));
}

export async function keptReport(visit, { id }, query) {
  const { report, loop } = await fetchReport(id, visit.signal);
  const name = instant(report.log.start) ?? "A log without a time of its own";
  const file = `${loop}-${(report.log.start ?? id).replace(/[:.]/g, "")}`;
  const target = report.selected === null ? null : [another(report, query, {
    ask: (wanted) => retune(id, wanted, visit.signal),
    onAsked: (wanted) => visit.name(`/reports/${id}?${new URLSearchParams(wanted)}`),
  }), cardForm(report, (body) => judgeCard({ ...body, report_id: id }, visit.signal))];
  visit.show(`${loop}, ${name}`, `Report on a log of ${loop}`,
    reportView(report, { name, file, loop: { name: loop, href: loopAddress(loop) }, target }));
}
