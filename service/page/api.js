// The service's calls. An answer is data or throws a Problem, whose fields are those of RFC 9457.

export class Problem extends Error {
  constructor({ title, detail, code, status, evidence }) {
    super(detail || title || "The service gave no reason.");
    this.code = code ?? "unknown";
    this.status = status ?? null;
    this.evidence = evidence ?? {};
  }
}

async function call(path, request = {}) {
  let response;
  try {
    response = await fetch(path, request);
  } catch (error) {
    if (error.name === "AbortError") throw error;
    throw new Problem({ code: "unreachable", detail: "The service does not answer. Check that it still runs, then try again." });
  }
  if (response.ok) return response;
  const type = response.headers.get("content-type") ?? "";
  const body = type.includes("json") ? await response.json().catch(() => ({})) : {};
  throw new Problem({
    status: response.status,
    code: body.code ?? `http-${response.status}`,
    title: body.title ?? `The service answered with status ${response.status}.`,
    detail: body.detail,
    evidence: body.evidence,
  });
}

const query = (options) => new URLSearchParams(Object.entries(options).filter(([, value]) => value !== ""));

function send(method, path, data, signal) {
  return call(path, { method, headers: { "Content-Type": "application/json" }, body: JSON.stringify(data), signal });
}

/** Address of a relation in a Link header (RFC 8288), or null. */
function related(response, relation) {
  const links = response.headers.get("link") ?? "";
  return links.match(new RegExp(`<([^>]*)>[^,]*rel="${relation}"`))?.[1] ?? null;
}

async function page(path, signal) {
  const response = await call(path, { signal });
  return { items: await response.json(), next: related(response, "next") };
}

/** All pages of a list, but never more than so many: {items, more}. */
async function pages(path, signal, most = 10) {
  const items = [];
  let next = path;
  for (let k = 0; next && k < most; k += 1) {
    const one = await page(next, signal);
    items.push(...one.items);
    next = one.next;
  }
  return { items, more: next !== null };
}

/** [{name, title, description}] */
export async function samples() {
  return (await call("/v1/samples")).json();
}

/** A packaged log as a Blob. */
export async function sample(name) {
  return (await call(`/v1/samples/${encodeURIComponent(name)}`)).blob();
}

/** The report on one log; `options` are the query's keys, empty ones left out. */
export async function analyse(log, options, signal) {
  const response = await call(`/v1/reports?${query(options)}`, {
    method: "POST",
    headers: { "Content-Type": "text/csv", Accept: "application/json" },
    body: log,
    signal,
  });
  return response.json();
}

/** What a log would be understood as. */
export async function preview(log, options, signal) {
  return (await call(`/v1/logs/preview?${query(options)}`, { method: "POST", headers: { "Content-Type": "text/csv" }, body: log, signal })).json();
}

const loopPath = (name) => `/v1/loops/${encodeURIComponent(name)}`;

/** One page of loops: {items, after}, `after` naming the next page or null. */
export async function loops({ after = "", limit = 20 }, signal) {
  const { items, next } = await page(`/v1/loops?${query({ limit, after })}`, signal);
  return { items, after: next && new URLSearchParams(next.split("?")[1]).get("after") };
}

/** Names that a loop may be chosen from. */
export async function loopNames(signal) {
  return (await page("/v1/loops?limit=1000", signal)).items.map(({ loop }) => loop);
}

export async function loop(name, signal) {
  return (await call(loopPath(name), { signal })).json();
}

export async function putLoop(name, settings, signal) {
  return (await send("PUT", loopPath(name), settings, signal)).json();
}

/** {items, more}: one row per report, in the order of the logs' own time. */
export const history = (name, signal) => pages(`${loopPath(name)}/history?limit=500`, signal);

/** {items, more}: the logs with their analyses, in order of arrival. */
export const logs = (name, signal) => pages(`${loopPath(name)}/logs?limit=1000`, signal);

/** The verdict on the last log, or null where no baseline is chosen. */
export async function drift(name, signal) {
  try {
    return await (await call(`${loopPath(name)}/drift`, { signal })).json();
  } catch (error) {
    if (error.code === "no-baseline") return null;
    throw error;
  }
}

export async function putBaseline(name, reports, signal) {
  return (await send("PUT", `${loopPath(name)}/baseline`, { report_ids: reports }, signal)).json();
}

/** Keep a log with a loop: its analysis, ended if it does so within `wait` seconds. */
export async function keep(name, log, options, wait, signal) {
  const headers = { "Content-Type": "text/csv", ...(wait > 0 && { Prefer: `wait=${wait}` }) };
  return (await call(`${loopPath(name)}/logs?${query(options)}`, { method: "POST", headers, body: log, signal })).json();
}

export async function analysis(id, signal) {
  return (await call(`/v1/analyses/${encodeURIComponent(id)}`, { signal })).json();
}

/** {report, loop}: a kept report and the name of the loop that it belongs to. */
export async function keptReport(id, signal) {
  const response = await call(`/v1/reports/${encodeURIComponent(id)}`, { signal });
  const whose = related(response, "collection");
  return { report: await response.json(), loop: whose && decodeURIComponent(whose.split("/").pop()) };
}

/** What an op-amp card's parts make of a plant. */
export async function card(body, signal) {
  return (await send("POST", "/v1/cards", body, signal)).json();
}

/** Other proposals from a kept fit. */
export async function retune(id, wanted, signal) {
  return (await send("POST", `/v1/reports/${encodeURIComponent(id)}/tunings`, wanted, signal)).json();
}
