/** Student's t distribution, ν > 0 not necessarily whole. */

/** Above this many degrees of freedom the normal law is the same to 1e-8. */
const asGoodAsNormal = 1e8;

/** Probability that t with `nu` degrees of freedom is at most `t`. */
export function studentTProbability(t: number, nu: number): number {
  return t > 0 ? 1 - tail(t, nu) : tail(-t, nu);
}

/** The value that t with `nu` degrees of freedom does not exceed with the probability `p`. */
export function studentTQuantile(p: number, nu: number): number {
  if (!(p > 0 && p < 1)) throw new Error(`a quantile needs a probability between 0 and 1, not ${p}`);
  if (p === 0.5) return 0;
  if (p < 0.5) return -studentTQuantile(1 - p, nu);
  const above = 1 - p;
  let high = 1;
  while (tail(high, nu) > above && high < 1e300) high *= 2;
  let low = high === 1 ? 0 : high / 2;
  for (let step = 0; step < 200 && high - low > 1e-15 * high; step += 1) {
    const middle = (low + high) / 2;
    if (tail(middle, nu) > above) low = middle;
    else high = middle;
  }
  return (low + high) / 2;
}

/** Probability above t ≥ 0. */
function tail(t: number, nu: number): number {
  if (t === 0) return 0.5;
  return nu > asGoodAsNormal ? normalTail(t) : 0.5 * regularisedBeta(t, nu);
}

/** ½ erfc(t/√2): power series for small t, continued fraction (Abramowitz & Stegun 26.2.14) for large. */
function normalTail(t: number): number {
  const density = Math.exp((-t * t) / 2) / Math.sqrt(2 * Math.PI);
  if (t < 2.5) {
    let term = t;
    let sum = t;
    for (let k = 1; Math.abs(term) > 1e-17 * sum; k += 1) {
      term *= (t * t) / (2 * k + 1);
      sum += term;
    }
    return 0.5 - density * sum;
  }
  let fraction = t;
  for (let k = 120; k >= 1; k -= 1) fraction = t + k / fraction;
  return density / fraction;
}

/** I_x(ν/2, ½) at x = ν/(ν + t²), by the continued fraction of the incomplete beta function (Abramowitz & Stegun 26.5.8). */
function regularisedBeta(t: number, nu: number): number {
  const [a, b] = [nu / 2, 0.5];
  const x = nu / (nu + t * t);
  const y = (t * t) / (nu + t * t);
  const front = Math.exp(logGammaRatio(a) - 0.5 * Math.log(Math.PI) - a * Math.log1p((t * t) / nu) + b * Math.log(y));
  if (x < (a + 1) / (a + b + 2)) return (front * betaFraction(x, a, b)) / a;
  return 1 - (front * betaFraction(y, b, a)) / b;
}

/** Lentz's rule, two terms at a time. */
function betaFraction(x: number, a: number, b: number): number {
  const tiny = 1e-300;
  const guard = (value: number) => (Math.abs(value) < tiny ? tiny : value);
  let c = 1;
  let d = 1 / guard(1 - ((a + b) * x) / (a + 1));
  let result = d;
  for (let m = 1; m <= 100_000; m += 1) {
    const even = (m * (b - m) * x) / ((a + 2 * m - 1) * (a + 2 * m));
    d = 1 / guard(1 + even * d);
    c = guard(1 + even / c);
    result *= d * c;
    const odd = (-(a + m) * (a + b + m) * x) / ((a + 2 * m) * (a + 2 * m + 1));
    d = 1 / guard(1 + odd * d);
    c = guard(1 + odd / c);
    const change = d * c;
    result *= change;
    if (Math.abs(change - 1) < 1e-16) break;
  }
  return result;
}

/** ln Γ(a + ½) − ln Γ(a): Stirling's series for both, the arguments raised until it holds to the last digit. */
function logGammaRatio(a: number): number {
  let shift = 0;
  let z = a;
  while (z < 20) {
    shift += Math.log(z / (z + 0.5));
    z += 1;
  }
  return shift + stirlingDifference(z);
}

function stirlingDifference(z: number): number {
  const y = z + 0.5;
  const correction = (x: number) => 1 / (12 * x) - 1 / (360 * x ** 3) + 1 / (1260 * x ** 5) - 1 / (1680 * x ** 7);
  // (y − ½) ln y − (z − ½) ln z − ½ with y − ½ = z, without the loss of digits at large z.
  return 0.5 * Math.log(z) + z * Math.log1p(0.5 / z) - 0.5 + correction(y) - correction(z);
}
