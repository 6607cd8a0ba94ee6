// Every view has an address after the #: "/", "/sample/step_test.csv", "/report".
// A route is a pattern with {names} and a function of (parameters, query); later views add theirs to the list.

export function router(routes, otherwise) {
  const compiled = routes.map(([pattern, view]) => [
    new RegExp(`^${pattern.replace(/\{(\w+)\}/g, "(?<$1>[^/]+)")}$`), view,
  ]);

  function go() {
    const address = location.hash.startsWith("#/") ? location.hash.slice(1) : "/";
    const [path, query = ""] = address.split("?");
    for (const [pattern, view] of compiled) {
      const match = pattern.exec(path);
      if (match) {
        const named = Object.entries(match.groups ?? {}).map(([k, v]) => [k, decodeURIComponent(v)]);
        return view(Object.fromEntries(named), Object.fromEntries(new URLSearchParams(query)));
      }
    }
    return otherwise(path);
  }

  addEventListener("hashchange", go);
  return {
    go,
    /** Move to an address; where it is the present one, show it afresh. */
    to(path) {
      if (location.hash === `#${path}`) go();
      else location.hash = path;
    },
  };
}
