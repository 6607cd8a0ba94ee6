// The service's calls. An answer is data or throws a Problem, whose fields are those of RFC 9457.

export class Problem extends Error {
  constructor({ title, detail, code, status }) {
    super(detail || title || "The service gave no reason.");
    this.code = code ?? "unknown";
    this.status = status ?? null;
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
  });
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
  const query = new URLSearchParams(Object.entries(options).filter(([, value]) => value !== ""));
  const response = await call(`/v1/reports?${query}`, {
    method: "POST",
    headers: { "Content-Type": "text/csv", Accept: "application/json" },
    body: log,
    signal,
  });
  return response.json();
}
