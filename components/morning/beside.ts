interface WithU {
  value: number;
  u: number | null;
}

/** Difference of two nights over the standard uncertainty of that difference, both scatters taken as independent; null without a u. */
export function beside(one: WithU, other: WithU): number | null {
  if (one.u === null || other.u === null) return null;
  const u = Math.hypot(one.u, other.u);
  return u === 0 ? null : Math.abs(one.value - other.value) / u;
}
