// A log is shown as it is understood; what its reader confirms is kept with the loop, and the log goes on.

import { loop as fetchLoop, preview, putLoop } from "/page/api.js";
import { fail } from "/page/flows/failing.js";
import { options as readOptions, READING } from "/page/views/options.js";
import { progress as progressView } from "/page/views/progress.js";
import { understood } from "/page/views/understood.js";

const ROLES = ["time", "setpoint", "command", "speed"];

/** go(options) takes the log on, once its reader says that it is read right. */
export async function look(visit, file, options, loop, go) {
  const { name } = file;
  const others = Object.fromEntries(Object.entries(options).filter(([key]) => !READING.includes(key)));
  const onAgain = (form) => look(visit, file, { ...others, ...readOptions(form) }, loop, go);
  visit.show(name, `Reading ${name}`, progressView(name, file.size, () => visit.again()));
  try {
    const seen = await preview(file, options, visit.signal);
    const onRight = async () => {
      try {
        if (loop) await remember(loop, options, visit.signal);
        await go(options);
      } catch (error) {
        fail(visit, error, { name, options });
      }
    };
    visit.show(name, `How ${name} is understood`, understood(seen, { name, loop, options, onRight, onAgain }));
  } catch (error) {
    fail(visit, error, { name, options, onAgain });
  }
}

/** Column names, zone and order of dates that were confirmed for a log are the loop's from now on. */
async function remember(name, options, signal) {
  const columns = Object.fromEntries(ROLES.filter((role) => options[role]).map((role) => [role, options[role]]));
  const own = { ...(options.zone && { zone: options.zone }), ...(options.date_order && { date_order: options.date_order }) };
  if (!Object.keys({ ...columns, ...own }).length) return;
  let known = {};
  try {
    known = await fetchLoop(name, signal);
  } catch (error) {
    if (error.code !== "no-such-loop") throw error;
  }
  await putLoop(name, { ...known, ...own, columns: { ...known.columns, ...columns } }, signal);
}
