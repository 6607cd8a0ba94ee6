// The views and their addresses. One view at a time stands in <main>.

import { h } from "/page/dom.js";
import { failing } from "/page/flows/failing.js";
import { analysis, keptReport } from "/page/flows/kept.js";
import { loop, loops, settings } from "/page/flows/loops.js";
import { home, oneOff, sample } from "/page/flows/one_off.js";
import { router } from "/page/router.js";

const main = document.getElementById("main");
const announce = document.getElementById("announce");
const links = [["#/", "Bring a log"], ["#/loops", "Loops"]].map(([href, text]) => h("a", { href }, text));

function show(path, title, message, ...content) {
  document.title = title ? `${title} · gainwright` : "gainwright";
  announce.textContent = message ?? "";
  const here = path === "/" ? "#/" : path.startsWith("/loops") ? "#/loops" : null;
  for (const link of links) {
    if (link.getAttribute("href") === here) link.setAttribute("aria-current", "page");
    else link.removeAttribute("aria-current");
  }
  main.replaceChildren(...content);
  main.focus({ preventScroll: true });
  scrollTo(0, 0);
}

function missing({ show: shown }, path) {
  shown("No such view", null, h("section", { class: "sheet" },
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

document.getElementById("nav").append(...links);
router([
  ["/", home], ["/report", oneOff], ["/sample/{name}", sample],
  ["/analyses/{id}", analysis], ["/reports/{id}", keptReport],
  ["/loops", loops], ["/loops/{name}", loop], ["/loops/{name}/settings", settings],
].map(([pattern, flow]) => [pattern, failing(flow)]), missing, show).go();

// On paper the palette is the light one; canvases are painted anew for it.
for (const [event, paper] of [["beforeprint", true], ["afterprint", false]]) {
  addEventListener(event, () => {
    document.documentElement.classList.toggle("paper", paper);
    dispatchEvent(new Event("repaint"));
  });
}
