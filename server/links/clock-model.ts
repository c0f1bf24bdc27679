/**
 * The controller's clock as seen from the host: offset and rate from four-timestamp exchanges (RFC 5905, SPEC 6), with
 * a standard uncertainty that holds. Of each stretch of time only the exchange with the least delay is kept (it tells
 * most about the offset); a line through these gives offset and drift.
 */
export interface ClockExchange {
  /** Host's monotonic time when the request's first byte was written, ms. */
  t1Ms: number;
  /** Controller time of the request's line feed, µs. */
  t2Us: number;
  /** Controller time just before the reply's first byte, µs. */
  t3Us: number;
  /** Host's monotonic time of the reply's line feed, ms. */
  t4Ms: number;
  /** Time the request's and the reply's bytes took on the wire, ms (SPEC 6.2). */
  outMs: number;
  inMs: number;
}

export interface Estimate {
  ms: number;
  /** Standard uncertainty, ms. */
  uMs: number;
}

interface Sample {
  atMs: number;
  offsetMs: number;
  delayMs: number;
}

interface Line {
  centreMs: number;
  /** Controller minus host at the centre, ms. */
  offsetMs: number;
  slope: number;
  varOffset: number;
  varSlope: number;
  /** Unknown difference between the two ways of the fastest exchange. */
  uAsymmetryMs: number;
}

const STRETCH_MS = 8_000;
const KEPT_STRETCHES = 40;
/** SPEC 6.4: an emulator that lags and catches up gives delays that cannot be. */
const IMPOSSIBLE_DELAY_MS = -0.15;
/** Rate error of a crystal before anything is known about it (common practice, no source). */
const PRIOR_SLOPE = 1e-4;
/** Least scatter of one offset: interrupt latency and the resolution of the stamps. */
const LEAST_SCATTER_MS = 0.01;
/** The offset of one exchange lies anywhere within ± delay / 2 (RFC 5905): a rectangle of that width has the standard uncertainty delay / √12. */
const RECTANGLE = Math.sqrt(12);
/** A clock has stepped, and the model is not merely off, beyond so many standard uncertainties and ms. */
const STEP_SIGMAS = 6;
const LEAST_STEP_MS = 5;
const UNKNOWN: Estimate = { ms: 0, uMs: 1000 };

export class ClockModel {
  private stretches: { key: number; best: Sample }[] = [];
  private line: Line | null = null;

  /** False when the exchange is impossible and was not used. */
  add({ t1Ms, t2Us, t3Us, t4Ms, outMs, inMs }: ClockExchange): boolean {
    const t1 = t1Ms + outMs;
    const t4 = t4Ms - inMs;
    const t2 = t2Us / 1000;
    const t3 = t3Us / 1000;
    const delayMs = t4 - t1 - (t3 - t2);
    if (delayMs < IMPOSSIBLE_DELAY_MS) return false;
    this.keep({ atMs: (t1 + t4) / 2, offsetMs: (t2 - t1 + (t3 - t4)) / 2, delayMs });
    return true;
  }

  /** Another controller, or the same one after a restart. */
  forget(): void {
    this.stretches = [];
    this.line = null;
  }

  get known(): boolean {
    return this.stretches.length > 0;
  }

  /** How much faster the controller's clock runs, as a ratio less 1; null before two stretches of time are known. */
  get drift(): { slope: number; uSlope: number } | null {
    const line = this.stretches.length < 2 ? null : this.fitted();
    return line === null ? null : { slope: line.slope, uSlope: Math.sqrt(line.varSlope) };
  }

  /**
   * By how much an exchange contradicts the model, ms; 0 when it does not. The true offset lies within half of the delay of the one
   * measured (RFC 5905), whatever the line does: what lies further off is a step of a clock.
   */
  contradiction({ t1Ms, t2Us, t3Us, t4Ms }: Pick<ClockExchange, 't1Ms' | 't2Us' | 't3Us' | 't4Ms'>): number {
    if (!this.known) return 0;
    const offsetMs = (t2Us / 1000 - t1Ms + (t3Us / 1000 - t4Ms)) / 2;
    const delayMs = t4Ms - t1Ms - (t3Us - t2Us) / 1000;
    const { ms, uMs } = this.offsetAt((t1Ms + t4Ms) / 2);
    const off = offsetMs - ms;
    return Math.abs(off) > Math.max(0, delayMs) / 2 + STEP_SIGMAS * uMs + LEAST_STEP_MS ? off : 0;
  }

  /** Controller minus host at the host's monotonic time `atMs`. */
  offsetAt(atMs: number): Estimate {
    const line = this.fitted();
    if (line === null) return UNKNOWN;
    const away = atMs - line.centreMs;
    const variance = line.varOffset + line.varSlope * away * away + line.uAsymmetryMs ** 2;
    return { ms: line.offsetMs + line.slope * away, uMs: Math.sqrt(variance) };
  }

  /** Host's monotonic time of a controller time. */
  hostMsAt(us: number): Estimate {
    const line = this.fitted();
    if (line === null) return UNKNOWN;
    const controllerMs = us / 1000;
    const ms = (controllerMs - line.offsetMs + line.slope * line.centreMs) / (1 + line.slope);
    return { ms, uMs: this.offsetAt(ms).uMs };
  }

  /** Controller time, whole µs, of a monotonic time of the host. */
  controllerUsAt(hostMs: number): number {
    return Math.round((hostMs + this.offsetAt(hostMs).ms) * 1000);
  }

  private keep(sample: Sample): void {
    const key = Math.floor(sample.atMs / STRETCH_MS);
    const last = this.stretches.at(-1);
    if (last?.key === key) {
      if (sample.delayMs >= last.best.delayMs) return;
      last.best = sample;
    } else {
      this.stretches.push({ key, best: sample });
      if (this.stretches.length > KEPT_STRETCHES) this.stretches.shift();
    }
    this.line = null;
  }

  private fitted(): Line | null {
    if (this.line === null && this.stretches.length > 0) this.line = fit(this.stretches.map(({ best }) => best));
    return this.line;
  }
}

/** Weighted least squares with a weak prior of zero slope; an exchange slower than the fastest counts less. */
function fit(samples: readonly Sample[]): Line {
  const least = Math.max(0, Math.min(...samples.map(({ delayMs }) => delayMs)));
  const weights = samples.map(({ delayMs }) => 1 / (LEAST_SCATTER_MS + Math.max(0, delayMs - least) / RECTANGLE) ** 2);
  const sum = (of: (sample: Sample, index: number) => number) => samples.reduce((total, sample, index) => total + of(sample, index), 0);
  const weight = sum((_, index) => weights[index] as number);
  const centreMs = sum(({ atMs }, index) => (weights[index] as number) * atMs) / weight;
  const offsetMs = sum((sample, index) => (weights[index] as number) * sample.offsetMs) / weight;
  const spread = sum(({ atMs }, index) => (weights[index] as number) * (atMs - centreMs) ** 2);
  const rise = sum((sample, index) => (weights[index] as number) * (sample.atMs - centreMs) * (sample.offsetMs - offsetMs));
  const stiffness = spread + 1 / PRIOR_SLOPE ** 2;
  const slope = rise / stiffness;
  const misfit = sum((sample, index) => (weights[index] as number) * (sample.offsetMs - offsetMs - slope * (sample.atMs - centreMs)) ** 2);
  /** Scatter greater than assumed (Birge ratio) widens both uncertainties. */
  const scale = Math.max(1, misfit / Math.max(1, samples.length - 2));
  return {
    centreMs,
    offsetMs,
    slope,
    varOffset: scale / weight,
    varSlope: scale / stiffness,
    uAsymmetryMs: Math.hypot(least / RECTANGLE, LEAST_SCATTER_MS),
  };
}
