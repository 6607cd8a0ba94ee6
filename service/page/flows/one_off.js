// A log comes in: looked at once and forgotten, or handed to a loop that keeps it.

import { analyse, keep, loopNames, sample as fetchSample, samples } from "/page/api.js";
import { fail } from "/page/flows/failing.js";
import { look } from "/page/flows/look.js";
import { report as reportView } from "/page/report/report.js";
import { options as readOptions } from "/page/views/options.js";
import { progress as progressView } from "/page/views/progress.js";
import { start as startView } from "/page/views/start.js";

// The log at hand {name, body, options}. It lives as long as the page: one-off logs are not kept anywhere.
let current = null;

export function home(visit) {
  return start(visit, null);
}

async function start(visit, told) {
  let [offered, names, notice] = [[], [], told];
  try {
    [offered, names] = await Promise.all([samples(), loopNames(visit.signal)]);
  } catch (error) {
    // Without the lists the page still takes logs; the reason is shown where they would be.
    notice ??= error.message;
  }
  const go = (file, options, loop) => (loop ? hand(visit, file, options, loop) : bring(file, options));
  const take = (file, { look: first, ...options }, loop) => (first
    ? look(visit, file, options, loop, (confirmed) => go(file, confirmed, loop))
    : go(file, options, loop));
  const bring = (file, options) => {
    current = { name: file.name, body: file, options };
    visit.to("/report");
  };
  const bringSample = async (name, { look: _, ...options }, loop) => {
    if (loop) {
      const log = await fetchSample(name).catch((error) => fail(visit, error, { name }));
      return log && hand(visit, new File([log], name), options, loop);
    }
    current = { name, options };
    return visit.to(`/sample/${encodeURIComponent(name)}`);
  };
  visit.show("", null, startView({ samples: offered, loops: names, notice, onLog: take, onSample: bringSample }));
}

/** Hand a log to a loop, then follow its analysis at the analysis's own address. */
export async function hand(visit, file, options, loop) {
  const stop = new AbortController();
  visit.signal.addEventListener("abort", () => stop.abort());
  visit.show(file.name, `Sending ${file.name}`, progressView(`${file.name} → ${loop}`, file.size, () => { stop.abort(); visit.again(); }));
  try {
    const kept = await keep(loop, file, options, 0, stop.signal);
    if (!visit.signal.aborted) visit.to(kept.report_id ? `/reports/${kept.report_id}` : `/analyses/${kept.id}`);
  } catch (error) {
    fail(visit, error, { name: file.name, title: "This log was not kept", options, onAgain: (form) => hand(visit, file, readOptions(form), loop) });
  }
}

export async function oneOff(visit) {
  if (!current?.body) return start(visit, "A one-off report lives only while its page is open. Drop the log again to see it.");
  const { name, body, options } = current;
  const onAgain = (form) => {
    current = { ...current, options: readOptions(form) };
    visit.again();
  };
  visit.show(name, `Reading ${name}`, progressView(name, body.size, () => visit.to("/")));
  try {
    const report = await analyse(body, options, visit.signal);
    visit.show(name, `The report on ${name} is ready`, reportView(report, { name, onAgain, options }));
  } catch (error) {
    fail(visit, error, { name, options, onAgain });
  }
}

export async function sample(visit, { name }) {
  const options = current?.name === name ? current.options : {};
  current = null;
  current = { name, body: await fetchSample(name), options };
  return visit.signal.aborted ? null : oneOff(visit);
}
