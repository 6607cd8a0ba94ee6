// Where a log comes in: drop zone, file picker, sample; once, or kept with a loop.

import { h } from "/page/dom.js";
import { optionFields, options } from "/page/views/options.js";

const EXAMPLE = `time,setpoint [rpm],command [%],speed [rpm]
2026-11-17T09:12:30.000Z,600.0,42.50,600.5
2026-11-17T09:12:30.100Z,600.0,42.84,596.0`;

function destination(loops) {
  return h("div", { class: "field destination" },
    h("label", { for: "loop" }, "Keep it with a loop"),
    h("input", { id: "loop", name: "loop", list: "loop-names", maxlength: 100, autocomplete: "off", spellcheck: "false", placeholder: "one-off: nothing is kept",
      "aria-describedby": "hint-loop", "data-testid": "loop-name", pattern: "[^\\/\\\\]+" }),
    h("datalist", { id: "loop-names" }, loops.map((value) => h("option", { value }))),
    h("p", { class: "hint", id: "hint-loop" }, "Name a loop, known or new, before you drop the log: the report then stays, and later logs of the loop are compared with it."));
}

export function start({ samples, loops, notice, onLog, onSample }) {
  const form = h("form", { onsubmit: (event) => event.preventDefault() });
  const send = (deliver) => {
    const { loop, ...rest } = options(form);
    if (form.reportValidity()) deliver(rest, loop);
  };
  const take = (file) => file && send((rest, loop) => onLog(file, rest, loop));
  const input = h("input", {
    id: "file", class: "unseen", type: "file", accept: ".csv,.txt,.tsv,.log,text/csv,text/plain", name: "log",
    "data-testid": "file", onchange: (event) => take(event.target.files[0]),
  });
  const zone = h("div", { class: "drop", "data-testid": "drop" },
    h("p", { class: "drop-title" }, "Drop a CSV log here"),
    h("p", { class: "drop-or" }, input, h("label", { class: "button", for: "file" }, "Choose a file"),
      samples.map((sample) => h("button", {
        class: "button quiet", type: "button", title: sample.description, "data-testid": "sample", onclick: () => send((rest, loop) => onSample(sample.name, rest, loop)),
      }, samples.length === 1 ? "Use the sample log" : sample.title))),
    samples.length === 1 && h("p", { class: "hint" }, `${samples[0].title}. ${samples[0].description}`));
  const lit = (on) => (event) => { event.preventDefault(); zone.classList.toggle("lit", on); };
  zone.addEventListener("dragenter", lit(true));
  zone.addEventListener("dragover", lit(true));
  zone.addEventListener("dragleave", lit(false));
  zone.addEventListener("drop", (event) => { lit(false)(event); take(event.dataTransfer.files[0]); });
  const first = h("label", { class: "tick" }, h("input", { type: "checkbox", name: "look", value: "yes", "data-testid": "look" }), " Show me first how it is read, and ask before going on");
  form.append(destination(loops), zone, h("p", { class: "hint" }, first), h("details", { class: "fold", "data-testid": "options" },
    h("summary", {}, "Options: target, PI or PID, controller period, zone, dates, column names"), optionFields()));
  return h("section", { class: "sheet start" },
    h("div", { class: "opening" },
      h("h1", {}, "From a speed loop’s log to settings you can defend"),
      h("p", { class: "lead" }, "Drop a log of one motor speed loop. Back comes a model of the motor with its uncertainty, and PI or PID settings that keep the robustness you ask for, with the response to expect."),
      notice && h("p", { class: "notice", role: "status", "data-testid": "notice" }, notice)),
    form,
    h("div", { class: "advice" },
      h("section", {}, h("h2", {}, "What the log needs"),
        h("p", {}, "Time, command and measured speed in columns; the setpoint too, if it was logged. Units in the header are read. Stamps may be ISO 8601, epoch or elapsed seconds."),
        h("pre", { tabindex: "0", "aria-label": "The first rows of a log" }, EXAMPLE)),
      h("section", {}, h("h2", {}, "What makes a good test"),
        h("p", {}, "In manual, wait until the speed is steady. Move the command by a few times what the noise hides, hold it until the speed has settled, and move it back; twice is better than once. Moves of the setpoint in automatic work too."),
        h("p", {}, "A one-off log is analysed and forgotten: nothing of it is kept. A log kept with a loop has its report at an address that stays."))));
}
