// Loops: the list, one loop with its nights, its settings.

import * as api from "/page/api.js";
import { fail } from "/page/flows/failing.js";
import { hand } from "/page/flows/one_off.js";
import { reportAddress, loopAddress, settingsAddress } from "/page/views/addresses.js";
import { loopList } from "/page/views/loop_list.js";
import { loopSettings } from "/page/views/loop_settings.js";
import { loopView } from "/page/views/loop.js";
import { sending } from "/page/views/sending.js";

const AT_ONCE = 3; // verdicts asked for at a time
const WAIT_S = 60;

export async function loops(visit, _, { after = "" }) {
  const found = await api.loops({ after }, visit.signal);
  const list = loopList(found.items, { after, next: found.after, onOpen: (name) => visit.to(settingsAddress(name).slice(1)) });
  visit.show("Loops", null, list.node);
  const watched = found.items.filter(({ baseline }) => baseline.length > 0);
  const ask = async () => {
    for (let one = watched.shift(); one && !visit.signal.aborted; one = watched.shift()) {
      await api.drift(one.loop, visit.signal).then((drift) => list.tell(one.loop, drift), (error) => list.unknown(one.loop, error));
    }
  };
  await Promise.all(Array.from({ length: AT_ONCE }, ask));
}

async function settled(promise) {
  return promise.catch((error) => {
    if (error instanceof api.Problem) return { problem: error };
    throw error;
  });
}

export async function loop(visit, { name }) {
  let known;
  try {
    known = await api.loop(name, visit.signal);
  } catch (error) {
    if (error.code !== "no-such-loop") throw error;
    return fail(visit, error, { name, title: "There is no such loop yet", loop: null, advice: "It begins with its first log, or with its settings: the list of loops has a place for a new name." });
  }
  const [history, logs, drift] = await Promise.all([
    settled(api.history(name, visit.signal)), settled(api.logs(name, visit.signal)), known.baseline.length ? settled(api.drift(name, visit.signal)) : null,
  ]);
  return visit.show(known.loop, null, loopView({ loop: known, history, logs, drift }, {
    onReport: (id) => visit.to(reportAddress(id).slice(1)),
    onBaseline: (ids) => api.putBaseline(name, ids, visit.signal).then(visit.again),
    onLogs: (files) => (files.length === 1 ? hand(visit, files[0], {}, name) : handAll(visit, files, name)),
    onAgain: visit.again,
  }));
}

/** Many logs, one after the other: each is kept before the next is sent. */
async function handAll(visit, files, name) {
  const view = sending(name, files.map((file) => file.name), () => visit.again());
  visit.show(name, `Sending ${files.length} logs`, view.node);
  for (const [i, file] of files.entries()) {
    if (visit.signal.aborted) return;
    view.begin(i);
    try {
      view.tell(i, await api.keep(name, file, {}, WAIT_S, visit.signal));
    } catch (error) {
      if (error.name === "AbortError") return;
      view.refuse(i, error);
    }
  }
  view.finish(loopAddress(name), () => visit.again());
}

export async function settings(visit, { name }) {
  let known = null;
  try {
    known = await api.loop(name, visit.signal);
  } catch (error) {
    if (error.code !== "no-such-loop") throw error;
  }
  visit.show(`Settings of ${name}`, null, loopSettings(name, known, {
    onSave: async (wanted) => {
      await api.putLoop(name, wanted, visit.signal);
      visit.to(loopAddress(name).slice(1));
    },
  }));
}
