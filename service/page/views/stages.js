// A kept log on its way: the stage that the service says it is in, nothing made up.

import { h } from "/page/dom.js";
import { exact } from "/page/format.js";
import { loopAddress } from "/page/views/addresses.js";

const STAGES = [["queued", "Waiting for its turn"], ["reading", "Reading the log"], ["fitting", "Fitting models"], ["judging", "Checking what the models are worth"],
  ["tuning", "Finding settings"], ["storing", "Keeping the report"]];

/** {node, tell(analysis)} */
export function stages() {
  const [loop, began] = [h("p", { class: "eyebrow" }), performance.now()];
  const [bar, clock] = [h("progress", { max: 1, "aria-label": "Share of the stages that are done" }), h("span", { class: "figures" })];
  const steps = STAGES.map(([stage, text]) => h("li", { "data-stage": stage }, text));
  const node = h("section", { class: "sheet", "data-testid": "stages" }, loop,
    h("h1", {}, "Working on the log"), bar, h("ol", { class: "stages" }, steps),
    h("p", { class: "note" }, "The log is safe: this address can be left and come back to. ", clock));
  return {
    node,
    tell({ loop: name, stage, progress }) {
      loop.replaceChildren("For the loop ", h("a", { href: loopAddress(name) }, name));
      bar.value = progress;
      clock.textContent = `${exact(Math.round((performance.now() - began) / 1000))} s`;
      for (const step of steps) {
        if (step.dataset.stage === stage) step.setAttribute("aria-current", "step");
        else step.removeAttribute("aria-current");
      }
    },
  };
}
