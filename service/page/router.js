// Every view has an address after the #: "/", "/sample/step_test.csv", "/loops/drum?…".
// A route is a pattern with {names} and a function of (visit, parameters, query). A visit lasts until the next one:
// its signal ends the requests that are still under way, and nothing of it is shown any more.

function decoded(text) {
  try {
    return decodeURIComponent(text);
  } catch {
    return text; // an address typed by hand
  }
}

export function router(routes, otherwise, show) {
  const compiled = routes.map(([pattern, view]) => [
    new RegExp(`^${pattern.replace(/\{(\w+)\}/g, "(?<$1>[^/]+)")}$`), view,
  ]);
  let leaving = new AbortController();

  const moves = {
    /** To an address; where it is the present one, show it afresh. */
    to(path) {
      if (location.hash === `#${path}`) go();
      else location.hash = path;
    },
    /** To an address in place of the present one, which "back" then skips. */
    instead(path) {
      location.replace(`#${path}`);
    },
    /** Name the address of what is on screen already. */
    name(path) {
      history.replaceState(null, "", `#${path}`);
    },
    again: () => go(),
  };

  function go() {
    leaving.abort();
    leaving = new AbortController();
    const { signal } = leaving;
    const address = location.hash.startsWith("#/") ? location.hash.slice(1) : "/";
    const [path, query = ""] = address.split("?");
    const visit = { ...moves, signal, path, show: (...shown) => signal.aborted || show(path, ...shown) };
    for (const [pattern, view] of compiled) {
      const match = pattern.exec(path);
      if (match) {
        const named = Object.entries(match.groups ?? {}).map(([k, v]) => [k, decoded(v)]);
        return view(visit, Object.fromEntries(named), Object.fromEntries(new URLSearchParams(query)));
      }
    }
    return otherwise(visit, path);
  }

  addEventListener("hashchange", go);
  return { go };
}
