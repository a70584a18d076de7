import { exact } from "./format.js";
import { numberFault, typedNumber } from "./typed_number.js";
import { rootsText, typedRoots } from "./typed_list.js";
import { fromShown, toShown } from "./units.js";

/** Every kind of stage with the numbers it takes, for entry by exact numbers. */

const frequency = (path, label) => ({
  path, label: (shown) => `${label}, ${shown}`,
  read: (text, shown) => oneNumber(text, (value) => fromShown(value, shown)),
  write: (value, shown) => (value === undefined ? "" : exact(toShown(value, shown))),
});
const plain = (path, label, start = "") => ({
  path, label: () => label, start, read: (text) => oneNumber(text, (value) => value), write: (value) => (value === undefined ? "" : exact(value)),
});
const roots = (path, label) => ({
  path, label: () => label, read: typedRoots, write: (value) => rootsText(value ?? []), hint: "real ones as −40, pairs as −1 ± 30j", optional: true,
});

function oneNumber(text, turn) {
  const value = typedNumber(text);
  const what = numberFault(text, value);
  return what ? { ok: false, what } : { ok: true, value: turn(value) };
}

export const STAGE_FORMS = [
  { kind: "lead_lag", label: "lead or lag", formula: "(1 + s/zero) / (1 + s/pole)", parts: [frequency("zero_rad_s", "o zero"), frequency("pole_rad_s", "x pole")] },
  { kind: "proportional_integral", label: "proportional-integral", formula: "(s + corner) / s", parts: [frequency("corner_rad_s", "corner")] },
  { kind: "integrator", label: "integrator", formula: "1 / s", parts: [] },
  { kind: "real_zero", label: "zero", formula: "1 + s/corner", parts: [frequency("corner_rad_s", "corner")] },
  { kind: "real_pole", label: "pole", formula: "1 / (1 + s/corner)", parts: [frequency("corner_rad_s", "corner")] },
  { kind: "complex_zeros", label: "pair of zeros", formula: "1 + 2·damping·s/natural + (s/natural)²", parts: [frequency("natural_rad_s", "natural frequency"), plain("damping", "damping")] },
  { kind: "complex_poles", label: "pair of poles", formula: "1 / (1 + 2·damping·s/natural + (s/natural)²)", parts: [frequency("natural_rad_s", "natural frequency"), plain("damping", "damping")] },
  { kind: "notch", label: "notch", formula: "(s² + 2·ζo·centre·s + centre²) / (s² + 2·ζx·centre·s + centre²)",
    parts: [frequency("centre_rad_s", "centre"), plain("zero_damping", "damping of the zeros, ζo"), plain("pole_damping", "damping of the poles, ζx")] },
  { kind: "rational", label: "rational stage", formula: "gain · Π(s − zero) / Π(s − pole)", parts: [plain("gain", "gain", "1"), roots("zeros", "zeros"), roots("poles", "poles")] },
];
