// The report's codes in the trade's words. An unknown code is shown as it came.

export const MODELS = {
  fopdt: "First-order lag with dead time",
  sopdt: "Second-order lag with dead time",
  arx: "Difference equation (ARX)",
};

export const PARAMETERS = {
  K: "Static gain",
  T: "Time constant",
  T1: "First time constant",
  T2: "Second time constant",
  L: "Dead time",
  "K/T": "Initial slope after a unit move of the command",
};

export const METHODS = {
  "largest-ki": "Largest integral gain within the target",
  simc: "SIMC rule",
};

export const OPERATIONS = {
  "open-loop": "Manual (open loop)",
  "closed-loop": "Automatic (closed loop)",
  unknown: "Could not be told from the log",
};

export const ROLES = { time: "Time", setpoint: "Setpoint", command: "Command", speed: "Measured speed" };

export const word = (words, code) => words[code] ?? code;

/** Class of the line that stands for a proposal: the recommended one solid, the others dashed each in its way. */
export function lineOf(index, recommended) {
  if (index === recommended) return "line best";
  const place = index - (recommended !== null && index > recommended ? 1 : 0);
  return `line other other-${place % 3}`;
}
