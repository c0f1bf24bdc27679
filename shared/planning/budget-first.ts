import type { RigDocument } from '../rig/document';
import { documentedBudget, type BudgetPart } from './plan-uncertainty';

/** What one measurement of the geometry leaves open in G, and what it would be worth to measure it twice as well. */
export interface MeasurementShare {
  /** Input of the budget, or `group NAME` for inputs that share their error. */
  source: string;
  /** Inputs behind it: one, or all of the group. */
  inputs: string[];
  /** Relative standard uncertainty of G from it alone. */
  relativeU: number;
  /** Share in the square of u(G). */
  share: number;
  /** Relative standard uncertainty of G if its u were half as great and all else as it is. */
  relativeUIfHalved: number;
}

export interface BudgetFirst {
  /** Relative standard uncertainty of G that the rig alone leaves, however many nights are measured. */
  relativeU: number;
  /** Greatest first. */
  measurements: MeasurementShare[];
}

/**
 * The budget of G before any night: what the stated u of the rig's quantities alone leave open, period and decay as measured beforehand. Null where the
 * rig does not tell enough (no sources, no period, no near and far) or where no quantity has a u.
 */
export function budgetFirst(rig: RigDocument): BudgetFirst | null {
  const parts = documentedBudget(rig, ({ oscillator: { periodS, decayTimeS } }) => {
    const { period_s: period, decayTime_s: decay } = rig.measured ?? {};
    return {
      signal: 0,
      period: ((period?.u ?? 0) / (period?.value ?? 1)) * periodS,
      decay: ((decay?.u ?? 0) / (decay?.value ?? 1)) * decayTimeS,
    };
  });
  const relativeU = Math.hypot(0, ...(parts ?? []).map((part) => part.relativeU));
  if (parts === null || relativeU === 0) return null;
  const measurements = parts
    .filter((part) => part.relativeU > 0)
    .map((part) => ({ ...worthOf(part, relativeU), source: part.source, inputs: part.inputs }))
    .sort((a, b) => b.relativeU - a.relativeU);
  return { relativeU, measurements };
}

/**
 * Relative standard uncertainty of the near minus far that a rig document predicts with the G of CODATA 2022, as an angle and on the scale, where the
 * lever's counts too: what moves G at a given deflection moves the deflection at a given G by as much, to 1 %. Null as above.
 */
export function predictedSignalU(rig: RigDocument): { angle: number; onScale: number } | null {
  const budget = budgetFirst(rig);
  if (budget === null) return null;
  const ofPendulum = budget.measurements.filter(({ inputs }) => !inputs.some((input) => input.startsWith('lever.')));
  return { angle: Math.hypot(0, ...ofPendulum.map(({ relativeU }) => relativeU)), onScale: budget.relativeU };
}

function worthOf({ relativeU: own, halved }: BudgetPart, all: number): Omit<MeasurementShare, 'source' | 'inputs'> {
  const rest = Math.max(0, all ** 2 - own ** 2);
  return { relativeU: own, share: (own / all) ** 2, relativeUIfHalved: Math.sqrt(rest + halved ** 2) };
}
