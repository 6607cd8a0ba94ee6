// Form fields with label, hint and, where the service refuses one, its reason.

import { h } from "/page/dom.js";

/** A labelled input; with choices [[value, text]] a select. */
export function field(name, label, hint, input = {}, choices = null) {
  const id = input.id ?? `option-${name}`;
  const attributes = { id, name, ...input, ...(hint && { "aria-describedby": `hint-${name}` }) };
  return h("div", { class: "field" },
    h("label", { for: id }, label),
    choices
      ? h("select", { ...attributes, value: null }, choices.map(([value, text]) => h("option", { value, selected: value === (input.value ?? "") }, text)))
      : h("input", { autocomplete: "off", spellcheck: "false", ...attributes }),
    hint && h("p", { class: "hint", id: `hint-${name}` }, hint));
}

/** What a form says: names to texts, empty ones left out. */
export function given(form) {
  return Object.fromEntries([...new FormData(form)]
    .filter(([name, value]) => typeof value === "string" && value.trim() !== "" && name !== "log")
    .map(([name, value]) => [name, value.trim()]));
}

/** Mark the fields that the service named, by name, and go to the first. */
export function refuse(form, reasons) {
  for (const old of form.querySelectorAll(".refused")) old.remove();
  for (const input of form.elements) input.removeAttribute("aria-invalid");
  const named = Object.entries(reasons).map(([name, reason]) => [form.elements.namedItem(name), reason]).filter(([input]) => input);
  for (const [input, reason] of named) {
    input.setAttribute("aria-invalid", "true");
    input.closest(".field").append(h("p", { class: "hint refused" }, String(reason)));
    input.closest("details")?.setAttribute("open", "");
  }
  named[0]?.[0].focus();
}
