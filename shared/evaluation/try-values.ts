import { firstIssue } from '../archive/unusable-archive';
import { rigDocumentSchema, type RigDocument } from '../rig/document';
import { quantityAt, withQuantity } from './budget-inputs';
import { fromStored, type GBasis } from './g-basis';
import { supposedG, type Supposed, type SupposedG } from './g-budget';
import { NoSolutionError } from './solve-g';

/** An input of the budget, supposed to have another value or another u; in the input's unit. */
export interface TriedValue {
  /** As the budget names it: a path in rig.json, `reversal_rad`, `period_s` or `decayTime_s`. */
  input: string;
  value: number;
  /** Standard uncertainty. */
  u: number;
}

const observedKeys = { reversal_rad: 'reversal', period_s: 'period', decayTime_s: 'decayTime' } as const;
const isObserved = (input: string): input is keyof typeof observedKeys => input in observedKeys;

/** What an input is now; null where the evaluation does not know it. */
export function documentedValue(rig: RigDocument, basis: GBasis, input: string): Omit<TriedValue, 'input'> | null {
  const known = isObserved(input) ? basis.known[observedKeys[input]] : quantityAt(rig, input.split('.'));
  return known === null ? null : { value: known.value, u: known.u };
}

/** Masses, lengths and times; an angle, a height, a zero or the difference itself may have either sign. */
const eitherSign = /^(reversal_rad|stations\..*|lever\.zero|.*\.(offset|angle))$/;
const isPositive = (rig: RigDocument, basis: GBasis, input: string) =>
  !eitherSign.test(input) && (documentedValue(rig, basis, input)?.value ?? 0) > 0;

/** G and its budget, by the code of the evaluation, if some inputs were otherwise; or why there would be none. */
export function tryValues(rig: RigDocument, basis: GBasis, tried: readonly TriedValue[]): SupposedG | { why: string } {
  const impossible = tried.find(({ input, value }) => !(value > 0) && isPositive(rig, basis, input));
  if (impossible !== undefined) return { why: `${impossible.input} has to be greater than 0` };
  let supposedRig = rig;
  const supposed: Supposed = {};
  for (const { input, value, u } of tried) {
    if (isObserved(input)) {
      const known = basis.known[observedKeys[input]];
      if (known !== null) supposed[observedKeys[input]] = { ...fromStored(known), value, u };
    } else supposedRig = withQuantity(supposedRig, input.split('.'), { value, u });
  }
  const { success, error } = rigDocumentSchema.safeParse(supposedRig);
  if (!success) return { why: firstIssue(error) };
  try {
    const found = supposedG(rig, basis, { ...supposed, rig: supposedRig });
    return Number.isFinite(found.bigG) ? found : { why: 'the sources would touch the pendulum' };
  } catch (failure) {
    if (failure instanceof NoSolutionError) return { why: failure.message };
    throw failure;
  }
}
