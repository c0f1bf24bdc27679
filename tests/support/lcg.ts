/**
 * The generator of the Allan-variance test set of NIST SP 1065: n ← 16807 n mod (2³¹ − 1), starting at 1234567890, each
 * divided by 2³¹ − 1. The products stay below 2⁵³, so doubles are exact.
 */
export function sp1065Uniforms(count: number): number[] {
  const modulus = 2147483647;
  const values: number[] = [];
  for (let n = 1234567890; values.length < count; n = (16807 * n) % modulus) values.push(n / modulus);
  return values;
}

/** Reproducible normal deviates (Box–Muller on the same generator, seeded). */
export function normalDeviates(seed: number): () => number {
  let n = seed;
  const uniform = () => {
    n = (16807 * n) % 2147483647;
    return n / 2147483647;
  };
  for (let k = 0; k < 20; k += 1) uniform();
  return () => Math.sqrt(-2 * Math.log(uniform())) * Math.cos(2 * Math.PI * uniform());
}
