/** Abscissae and weights of Gauss and Legendre's rule with `count` points on (0, 1), by Newton's rule on the Legendre polynomial. */
export function gaussLegendre(count: number): [x: number, weight: number][] {
  return Array.from({ length: count }, (_, k) => {
    let z = Math.cos((Math.PI * (k + 0.75)) / (count + 0.5));
    let slope = 1;
    for (let iteration = 0; iteration < 100; iteration += 1) {
      let [before, value] = [1, z];
      for (let n = 1; n < count; n += 1) [before, value] = [value, ((2 * n + 1) * z * value - n * before) / (n + 1)];
      slope = (count * (z * value - before)) / (z * z - 1);
      const step = value / slope;
      z -= step;
      if (Math.abs(step) < 1e-15) break;
    }
    return [(1 - z) / 2, 1 / ((1 - z * z) * slope * slope)];
  });
}
