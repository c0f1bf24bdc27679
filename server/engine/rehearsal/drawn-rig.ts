import { budgetInputs } from '@/shared/evaluation/budget-inputs';
import { seededStreams, type GaussianSource } from '@/shared/physics/seeded-gaussian';
import type { Quantity, RigDocument } from '@/shared/rig/document';
import { drawn, type Law } from '@/shared/statistics/draws';

/** A rig that differs from its document by what the document admits, as every real one does. */
export interface DrawnRig {
  rig: RigDocument;
  /** Where the sources stand, deg, when the turntable counts so many: what the stations are off, and in between in proportion. */
  angleDeg(countedDeg: number): number;
}

/** Neighbouring seeds begin alike; after so many numbers the generator has forgotten that. */
const forgotten = 200;
/** Drawn from a stream of its own, so that the noise is that of the same seed without it. */
const ownSeed = (seed: number) => (seed ^ 0x47454f4d) >>> 0;

/** Masses, lengths and stations drawn from their values, uncertainties and distributions; those of one group are off by as many of their u. */
export function drawnRig(documented: RigDocument, seed: number): DrawnRig {
  const [stream] = seededStreams(ownSeed(seed), 1) as [GaussianSource];
  for (let k = 0; k < forgotten; k += 1) stream.next();
  const groups = new Map<string, number>();
  const deviateOf = (quantity: Quantity): number => {
    const shared = quantity.group === undefined ? undefined : groups.get(quantity.group);
    const deviate = shared ?? drawn(lawOf(quantity), stream);
    if (quantity.group !== undefined) groups.set(quantity.group, deviate);
    return deviate;
  };
  const steps = budgetInputs(documented, { stations: Object.keys(documented.stations), lever: false })
    .filter(({ quantity }) => quantity.u > 0)
    .map(({ path, quantity }) => ({ path, step: quantity.u * deviateOf(quantity) }));
  const rig = steps.reduce((changed, { path, step }) => {
    const own = budgetInputs(changed, { stations: Object.keys(changed.stations), lever: false }).find((one) => one.path === path);
    return own === undefined ? changed : own.shifted(step);
  }, documented);
  return { rig, angleDeg: anglesBetween(documented, rig) };
}

function lawOf({ distribution, nu }: Quantity): Law {
  if (distribution === 'rectangular') return { kind: 'rectangular' };
  return nu === undefined || !Number.isFinite(nu) ? { kind: 'normal' } : { kind: 't', nu };
}

function anglesBetween(documented: RigDocument, actual: RigDocument): (countedDeg: number) => number {
  const off = new Map<number, number>();
  for (const [name, { value }] of Object.entries(documented.stations))
    if (!off.has(value)) off.set(value, (actual.stations[name]?.value ?? value) - value);
  const places = [...off].sort(([a], [b]) => a - b);
  return (countedDeg) => {
    const next = places.findIndex(([at]) => at >= countedDeg);
    const [after, before] = [places[next], places[next < 0 ? places.length - 1 : next - 1]];
    if (after === undefined || before === undefined) return countedDeg + ((after ?? before)?.[1] ?? 0);
    const share = (countedDeg - before[0]) / (after[0] - before[0]);
    return countedDeg + before[1] + share * (after[1] - before[1]);
  };
}
