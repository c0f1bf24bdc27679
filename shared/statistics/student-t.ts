/** Student's t distribution, ν > 0 not necessarily whole. */

/** Probability that t with `nu` degrees of freedom is at most `t`. */
export function studentTProbability(t: number, nu: number): number {
  if (nu === Infinity) return normalProbability(t);
  const tail = 0.5 * regularisedBeta(nu / (nu + t * t), nu / 2);
  return t > 0 ? 1 - tail : tail;
}

/** The value that t with `nu` degrees of freedom does not exceed with the probability `p`. */
export function studentTQuantile(p: number, nu: number): number {
  if (!(p > 0 && p < 1)) throw new Error(`a quantile needs a probability between 0 and 1, not ${p}`);
  if (p === 0.5) return 0;
  if (p < 0.5) return -studentTQuantile(1 - p, nu);
  const above = 1 - p;
  const tailAt = (t: number) => (nu === Infinity ? 1 - normalProbability(t) : 0.5 * regularisedBeta(nu / (nu + t * t), nu / 2));
  let high = 1;
  while (tailAt(high) > above && high < 1e300) high *= 2;
  let low = high / 2 < 1 ? 0 : high / 2;
  for (let step = 0; step < 200 && high - low > 1e-15 * high; step += 1) {
    const middle = (low + high) / 2;
    if (tailAt(middle) > above) low = middle;
    else high = middle;
  }
  return (low + high) / 2;
}

/** The normal law is the limit of many degrees of freedom; at 1e13 the two differ by less than the rounding. */
function normalProbability(t: number): number {
  return studentTProbability(t, 1e13);
}

/** I_x(a, ½), by the continued fraction of the incomplete beta function (Abramowitz & Stegun 26.5.8), evaluated with Lentz's rule. */
function regularisedBeta(x: number, a: number): number {
  const b = 0.5;
  if (x <= 0) return 0;
  if (x >= 1) return 1;
  const front = Math.exp(logGammaRatio(a) - 0.5 * Math.log(Math.PI) + a * Math.log(x) + b * Math.log1p(-x));
  if (x < (a + 1) / (a + b + 2)) return (front * betaFraction(x, a, b)) / a;
  return 1 - (front * betaFraction(1 - x, b, a)) / b;
}

function betaFraction(x: number, a: number, b: number): number {
  const tiny = 1e-300;
  const guard = (value: number) => (Math.abs(value) < tiny ? tiny : value);
  let c = 1;
  let d = 1 / guard(1 - ((a + b) * x) / (a + 1));
  let result = d;
  for (let m = 1; m <= 10_000; m += 1) {
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
