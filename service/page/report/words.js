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
  w0: "Natural frequency",
  zeta: "Damping ratio",
  T_r: "Average residence time",
  "K/T": "Initial slope after a unit move of the command",
  "K/(T1 + T2)": "Gain over the sum of the time constants",
  "T1 + T2": "Sum of the time constants",
};

/** Of a ringing fit, whose time constants are not real numbers. */
export const RINGING = {
  "K/(T1 + T2)": ["K w0/(2 zeta)", "Gain over what stands for the sum of time constants"],
  "T1 + T2": ["2 zeta/w0", "Stands for the sum of time constants"],
};

/** The model's transfer function from command to speed, by the parameters that it has. */
export function formula({ parameters: p }) {
  if ("T" in p) return "K exp(−L s)/(T s + 1)";
  if ("T1" in p) return "K exp(−L s)/((T1 s + 1)(T2 s + 1))";
  if ("zeta" in p) return "K w0² exp(−L s)/(s² + 2 zeta w0 s + w0²)";
  return null;
}

export const FORMS = { pi: "PI", pid: "PID" };
export const GOALS = { integral: "Largest integral gain", load: "Least error after a load step", setpoint: "Least error after a setpoint step" };

export const METHODS = {
  "largest-ki": "Largest integral gain within the target",
  "largest-ki-calm-derivative": "Largest integral gain with a calmer derivative",
  "held-for-95-percent": "Keeps the target on 95 % of the plants that the log allows",
  "least-iae-load": "Smallest error after a load step within the target",
  "least-iae-setpoint": "Smallest error after a setpoint step within the target",
  simc: "SIMC rule",
  installed: "Installed settings",
  "improved-simc": "Improved SIMC",
  amigo: "AMIGO",
  lambda: "Lambda tuning",
  imc: "IMC",
  "ziegler-nichols-step": "Ziegler–Nichols, step response",
  "ziegler-nichols-ultimate": "Ziegler–Nichols, ultimate gain",
  "cohen-coon": "Cohen–Coon",
  "chien-hrones-reswick-setpoint": "Chien–Hrones–Reswick, setpoint, no overshoot",
  "chien-hrones-reswick-load": "Chien–Hrones–Reswick, load, no overshoot",
  "tyreus-luyben": "Tyreus–Luyben",
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
