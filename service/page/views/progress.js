// While the service works: what is happening, for how long, and a way out.

import { h } from "/page/dom.js";

function size(bytes) {
  return bytes < 1e6 ? `${Math.max(1, Math.round(bytes / 1e3))} kB` : `${(bytes / 1e6).toFixed(1)} MB`;
}

export function progress(name, bytes, onCancel) {
  const clock = h("span", { class: "figures" }, "0 s");
  const began = performance.now();
  const timer = setInterval(() => {
    if (!clock.isConnected) clearInterval(timer);
    clock.textContent = `${Math.round((performance.now() - began) / 1000)} s`;
  }, 1000);
  return h("section", { class: "sheet", "data-testid": "progress", "aria-busy": "true" },
    h("p", { class: "eyebrow" }, name),
    h("h1", {}, "Working on the log"),
    h("progress", { "aria-label": "The service is working" }),
    h("p", { class: "note" }, `${size(bytes)} sent. Reading, fitting and tuning take a few seconds. `, clock),
    h("button", { class: "button quiet", type: "button", onclick: onCancel }, "Stop"));
}
