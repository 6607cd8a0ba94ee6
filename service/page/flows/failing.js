// A flow that fails shows why, unless the reader has gone elsewhere meanwhile.

import { Problem } from "/page/api.js";
import { problem as problemView } from "/page/views/problem.js";

/** extra: what the problem view may offer besides the reason. */
export function fail(visit, error, extra) {
  if (error.name === "AbortError" || visit.signal.aborted) return;
  if (!(error instanceof Problem)) console.error(error);
  const shown = error instanceof Problem ? error : new Problem({ code: "page-error", detail: `The page could not draw this view: ${error.message}` });
  visit.show("Not done", shown.message, problemView(shown, extra));
}

export function failing(flow) {
  return async (visit, parameters, query) => {
    try {
      await flow(visit, parameters, query);
    } catch (error) {
      fail(visit, error, { title: "This view cannot be shown" });
    }
  };
}
