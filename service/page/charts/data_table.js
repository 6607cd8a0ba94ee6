// The same figures as a chart, as a table: built when first opened, thinned evenly to a readable length.

import { h, table } from "/page/dom.js";
import { significant } from "/page/format.js";

const LONGEST = 60;

/** columns: [[header, values]], all of one length; `which` where several tables stand together. */
export function dataTable(caption, columns, which) {
  const rows = columns[0][1].length;
  const shown = Math.min(rows, LONGEST);
  const pick = Array.from({ length: shown }, (_, k) => (shown === 1 ? 0 : Math.round((k * (rows - 1)) / (shown - 1))));
  const details = h("details", { class: "fold small" },
    h("summary", {}, which ? `As a table: ${which}` : "As a table", shown < rows && ` (${shown} of ${rows} points)`));
  details.addEventListener("toggle", () => {
    if (details.open && details.childElementCount === 1) {
      details.append(table(caption, columns.map(([head]) => head),
        pick.map((i) => columns.map(([, values]) => significant(values[i], 5))), { class: "long" }));
    }
  });
  return details;
}
