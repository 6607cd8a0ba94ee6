// Ticks of a time axis: whole hours, days or months of UTC, with as much of the date as they need.

const HOUR = 3.6e6;
const DAY = 24 * HOUR;
const STEPS = [1 / 60, 1 / 12, 1 / 4, 1, 3, 6, 12, 24, 2 * 24, 4 * 24, 7 * 24, 14 * 24].map((hours) => hours * HOUR);
const MONTHS = [1, 2, 3, 6, 12, 24, 60, 120];

const format = (options) => new Intl.DateTimeFormat("en-GB", { timeZone: "UTC", ...options });
const CLOCK = format({ hour: "2-digit", minute: "2-digit", hourCycle: "h23" });
const DATE = format({ day: "numeric", month: "short" });
const MONTH = format({ month: "short", year: "numeric" });

/** {values, text(value)} for about `count` ticks in [low, high], ms. */
export function calendar([low, high], count) {
  const step = STEPS.find((one) => (high - low) / one <= count);
  if (step === undefined) return { values: months(low, high, count), text: (v) => MONTH.format(v) };
  // Weeks begin on Mondays: the first of them came four days after the epoch.
  const origin = step >= 7 * DAY ? 4 * DAY : 0;
  const values = [];
  for (let k = Math.ceil((low - origin) / step); origin + k * step <= high; k += 1) values.push(origin + k * step);
  return { values, text: (v) => (step < DAY && v % DAY !== 0 ? CLOCK : DATE).format(v) };
}

function months(low, high, count) {
  const [first, last] = [new Date(low), new Date(high)];
  const number = (date) => 12 * date.getUTCFullYear() + date.getUTCMonth();
  const step = MONTHS.find((one) => (number(last) - number(first)) / one <= count) ?? 240;
  const values = [];
  for (let k = Math.ceil(number(first) / step) * step; Date.UTC(0, k) <= high || values.length === 0; k += step) {
    const at = Date.UTC(Math.floor(k / 12), k % 12);
    if (at > high) break;
    if (at >= low) values.push(at);
  }
  return values;
}
