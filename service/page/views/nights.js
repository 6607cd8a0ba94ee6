/** K, T, L of the first-order fit beside the chosen second-order model; {} where that is the chosen one. */
export const besideOf = (row) => (row.model === "sopdt" ? row.first_order : {});

// What a night is to its loop: part of the baseline, moved, without news, or an ordinary one.

export function kindOf(row, drift) {
  if (row.in_baseline) return "baseline";
  const said = drift?.nights.find(({ report_id }) => report_id === row.report_id)?.verdict;
  return said === "moved" || said === "no-news" ? said : row.excitation.sufficient ? "plain" : "no-news";
}
