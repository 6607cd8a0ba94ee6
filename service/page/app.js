// The flow: a log comes in, a report goes on screen. One view at a time stands in <main>.

import { analyse, Problem, sample, samples } from "/page/api.js";
import { h } from "/page/dom.js";
import { report as reportView } from "/page/report/report.js";
import { router } from "/page/router.js";
import { options as readOptions } from "/page/views/options.js";
import { problem as problemView } from "/page/views/problem.js";
import { progress as progressView } from "/page/views/progress.js";
import { start as startView } from "/page/views/start.js";

const main = document.getElementById("main");
const announce = document.getElementById("announce");
// The log at hand {name, body, options}. It lives as long as the page: one-off logs are not kept anywhere.
let current = null;
let working = null;

function show(title, message, ...content) {
  document.title = title ? `${title} · gainwright` : "gainwright";
  announce.textContent = message ?? "";
  main.replaceChildren(...content);
  main.focus({ preventScroll: true });
  scrollTo(0, 0);
}

async function home(notice) {
  working?.abort();
  let offered = [];
  try {
    offered = await samples();
  } catch (error) {
    // Without the list the page still takes logs; the reason is shown where the samples would be.
    notice ??= error.message;
  }
  show("", null, startView({ samples: offered, notice, onLog: bring, onSample: bringSample }));
}

function bring(file, options) {
  current = { name: file.name, body: file, options };
  routes.to("/report");
}

function bringSample(name, options) {
  current = { name, options };
  routes.to(`/sample/${encodeURIComponent(name)}`);
}

async function run() {
  if (!current?.body) return home("A one-off report lives only while its page is open. Drop the log again to see it.");
  const { name, body, options } = current;
  working?.abort();
  const mine = (working = new AbortController());
  show(name, `Reading ${name}`, progressView(name, body.size, () => { mine.abort(); routes.to("/"); }));
  try {
    const report = await analyse(body, options, mine.signal);
    if (mine.signal.aborted) return;
    show(name, `The report on ${name} is ready`, reportView(report, { name, onAgain: again, options }));
  } catch (error) {
    if (error.name === "AbortError") return;
    fail(error);
  }
}

function again(form) {
  current = { ...current, options: readOptions(form) };
  run();
}

function fail(error) {
  if (!(error instanceof Problem)) console.error(error);
  const shown = error instanceof Problem ? error : new Problem({ code: "page-error", detail: `The page could not draw this report: ${error.message}` });
  show("Not done", shown.message, problemView(shown, current, { onAgain: again }));
}

async function fromSample({ name }) {
  try {
    current = { name, body: await sample(name), options: current?.name === name ? current.options : {} };
  } catch (error) {
    current = null;
    return fail(error);
  }
  return run();
}

function missing(path) {
  show("No such view", null, h("section", { class: "sheet" },
    h("h1", {}, "There is nothing at this address"), h("p", {}, path), h("p", {}, h("a", { href: "#/" }, "Bring a log"))));
}

// Places within a view are reached without touching its address.
addEventListener("click", (event) => {
  const link = event.target.closest?.('a[href^="#"]:not([href^="#/"])');
  const place = link && document.getElementById(link.hash.slice(1));
  if (!place) return;
  event.preventDefault();
  place.tabIndex = -1;
  place.focus({ preventScroll: true });
  place.scrollIntoView();
});

const routes = router([["/", () => home()], ["/report", run], ["/sample/{name}", fromSample]], missing);
document.getElementById("nav").append(h("a", { href: "#/" }, "Bring a log"));
routes.go();

// On paper the palette is the light one; canvases are painted anew for it.
for (const [event, paper] of [["beforeprint", true], ["afterprint", false]]) {
  addEventListener(event, () => {
    document.documentElement.classList.toggle("paper", paper);
    dispatchEvent(new Event("repaint"));
  });
}
