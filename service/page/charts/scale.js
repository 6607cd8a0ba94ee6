// Scales and ticks: data to pixels, and the round numbers between.

/** Linear map from [low, high] to [from, to]. */
export function linear([low, high], [from, to]) {
  const slope = (to - from) / (high - low || 1);
  return (value) => from + (value - low) * slope;
}

/** Round steps (1, 2, 5 times a power of ten) inside [low, high], about `count` of them. */
export function ticks([low, high], count = 5) {
  const raw = (high - low) / count;
  const power = 10 ** Math.floor(Math.log10(raw));
  const step = power * [1, 2, 5, 10].find((factor) => factor * power >= raw * 0.999);
  const first = Math.ceil(low / step - 1e-9);
  const values = [];
  for (let k = first; k * step <= high + step * 1e-9; k += 1) values.push(k * step);
  return { values, decimals: decimals(step) };
}

/** Decimals that a step between ticks needs: 2.5 needs one. */
export function decimals(step) {
  for (let d = 0; d < 9; d += 1) {
    const scaled = Math.abs(step) * 10 ** d;
    if (Math.abs(scaled - Math.round(scaled)) < 1e-6 * scaled) return d;
  }
  return 9;
}

/** Smallest and largest number in lists that may hold nulls, widened by a share of their span. */
export function extent(lists, share = 0.06, include = []) {
  let [low, high] = [Infinity, -Infinity];
  for (const list of [...lists, include]) {
    for (const value of list) {
      if (value === null) continue;
      if (value < low) low = value;
      if (value > high) high = value;
    }
  }
  if (low === high) return [low - 1, high + 1];
  const room = (high - low) * share;
  return [low - room, high + room];
}
