// From values to pixels and back, linear or logarithmic, with round ticks.

const STEPS = [1, 2, 5, 10];

/** The round number at or above `rough`: 1, 2 or 5 times a power of ten. */
export function roundStep(rough) {
  const power = 10 ** Math.floor(Math.log10(rough));
  return power * STEPS.find((step) => step * power >= rough * 0.999999);
}

/** A domain that holds [low, high] with a little air; `zero` starts it at nought, `log` keeps it above it. */
export function domainOf(low, high, { zero = false, log = false } = {}) {
  if (!(low <= high)) return log ? [0.1, 10] : [0, 1];
  if (log) return [low / 1.25, high * 1.25];
  if (low === high) { const air = Math.abs(low) * 0.1 || 1; low -= air; high += air; }
  const air = (high - low) * 0.06;
  return [zero && low >= 0 ? 0 : low - air, high + air];
}

/** Least and greatest of the numbers in `values`, NaN left out; `above` leaves out what is not greater. */
export function extent(values, above = -Infinity) {
  let low = Infinity, high = -Infinity;
  for (const value of values) {
    if (value > above) {
      if (value < low) low = value;
      if (value > high) high = value;
    }
  }
  return [low, high];
}

export class Scale {
  /** `domain` in values, `range` in pixels; either may run downwards. */
  constructor(domain, range, log = false) {
    this.domain = domain;
    this.range = range;
    this.log = log;
    const [a, b] = domain.map((value) => this.#bend(value));
    this.slope = (range[1] - range[0]) / (b - a);
    this.shift = range[0] - this.slope * a;
  }

  #bend(value) { return this.log ? Math.log10(value) : value; }

  to(value) { return this.shift + this.slope * this.#bend(value); }

  from(pixel) {
    const bent = (pixel - this.shift) / this.slope;
    return this.log ? 10 ** bent : bent;
  }

  /** Round values inside the domain, about `count` of them; whole decades where logarithmic. */
  ticks(count) {
    const [low, high] = [Math.min(...this.domain), Math.max(...this.domain)];
    if (this.log) return decades(low, high);
    const step = roundStep((high - low) / Math.max(1, count));
    const found = [];
    for (let n = Math.ceil(low / step - 1e-9); n * step <= high + step * 1e-9; n += 1) found.push(Number((n * step).toPrecision(12)));
    return found;
  }
}

function decades(low, high) {
  const found = [];
  for (let power = Math.ceil(Math.log10(low) - 1e-9); 10 ** power <= high * (1 + 1e-9); power += 1) found.push(Number(`1e${power}`));
  return found;
}

/** Which way a rejected value lies beyond the ends of an axis: -1, 0 or 1, and the value where it is drawn. */
export function held([low, high], value) {
  return value < low ? [-1, low] : value > high ? [1, high] : [0, value];
}

/** A tick as it is written: no trailing noise, thousands left whole. */
export function tickText(value) {
  const size = Math.abs(value);
  if (size !== 0 && (size < 0.001 || size >= 1e6)) return value.toExponential(0);
  return String(Number(value.toPrecision(6)));
}
