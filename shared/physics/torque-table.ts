/** A function with its derivative. */
export interface ValueAndSlope {
  value: number;
  slope: number;
}

/** Knots a quarter of a degree apart: the cubic between two is right to 1e-10 of a torque that varies over half a radian. */
const spacingRad = Math.PI / 720;

/**
 * A costly function of an angle (rad) as a spline: cubics through values and slopes at knots, each worked out when it is first needed, so
 * that a geometry of which only the neighbourhood of two stations is asked costs a few knots.
 */
export function splined(exact: (psiRad: number) => ValueAndSlope): (psiRad: number) => ValueAndSlope {
  const knots = new Map<number, ValueAndSlope>();
  const knot = (index: number): ValueAndSlope => {
    const known = knots.get(index);
    if (known !== undefined) return known;
    const made = exact(index * spacingRad);
    knots.set(index, made);
    return made;
  };
  return (psiRad) => {
    const place = psiRad / spacingRad;
    const index = Math.floor(place);
    const [from, to] = [knot(index), knot(index + 1)];
    const x = place - index;
    const rise = to.value - from.value;
    const [begin, end] = [from.slope * spacingRad - rise, rise - to.slope * spacingRad];
    const bend = begin * (1 - x) + end * x;
    return {
      value: from.value + x * rise + x * (1 - x) * bend,
      slope: (rise + (1 - 2 * x) * bend + x * (1 - x) * (end - begin)) / spacingRad,
    };
  };
}
