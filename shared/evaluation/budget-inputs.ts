import type { Quantity, RigDocument } from '../rig/document';

/** One quantity of rig.json that G may depend on. */
export interface BudgetInput {
  /** Path in rig.json; dots mean nesting, parts of a list are counted from 0. */
  path: string;
  quantity: Quantity;
  /** The rig with this quantity's value changed by `step` (in its unit). */
  shifted(step: number): RigDocument;
}

/**
 * The quantities of a rig that enter G through torque and inertia, the stations in use, and the lever where the channel is
 * a spot position. The measured period and decay time enter through period_s and decayTime_s.
 */
export function budgetInputs(rig: RigDocument, use: { stations: readonly string[]; lever: boolean }): BudgetInput[] {
  const paths = [
    ...['arm', 'ballMass', 'ballRadius', 'beamMass', 'beamLength', 'extraInertia'].map((key) => ['pendulum', key]),
    ...['mass', 'orbit', 'offset', ...(rig.sources.shape === 'cylinder' ? ['radius', 'height'] : [])].map((key) => ['sources', key]),
    ...(rig.sources.extra ?? []).flatMap((_, k) => ['mass', 'orbit', 'angle', 'offset'].map((key) => ['sources', 'extra', String(k), key])),
    ...use.stations.map((name) => ['stations', name]),
    ...(use.lever ? ['distance', 'zero'].map((key) => ['lever', key]) : []),
  ];
  return paths.flatMap((path) => {
    const quantity = quantityAt(rig, path);
    if (quantity === null) return [];
    return [{ path: path.join('.'), quantity, shifted: (step: number) => withQuantity(rig, path, { value: quantity.value + step }) }];
  });
}

function nodeAt(rig: RigDocument, path: readonly string[]): Record<string, unknown> | null {
  let node: unknown = rig;
  for (const key of path) {
    if (typeof node !== 'object' || node === null) return null;
    node = (node as Record<string, unknown>)[key];
  }
  return typeof node === 'object' && node !== null ? (node as Record<string, unknown>) : null;
}

/** The quantity at a path of rig.json; null where there is none. */
export function quantityAt(rig: RigDocument, path: readonly string[]): Quantity | null {
  const node = nodeAt(rig, path);
  return node !== null && typeof node.value === 'number' ? (node as unknown as Quantity) : null;
}

/** A copy of the rig with the quantity at the path changed. */
export function withQuantity(rig: RigDocument, path: readonly string[], change: { value: number; u?: number }): RigDocument {
  const copy = structuredClone(rig);
  const node = nodeAt(copy, path);
  if (node !== null) Object.assign(node, change);
  return copy;
}

/** A step for a numerical derivative: small beside the value, or a thousandth of what is natural for its unit where the value is 0. */
export function derivativeStep({ value, unit }: Quantity): number {
  const natural: Record<string, number> = { m: 1e-4, kg: 1e-3, deg: 0.02, 'kg.m2': 1e-8 };
  if (unit === 'deg') return 0.002;
  return value === 0 ? (natural[unit] ?? 1e-4) : 1e-4 * Math.abs(value);
}
