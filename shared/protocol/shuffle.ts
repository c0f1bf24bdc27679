import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import type { ProtocolDocument, RepeatStep, Step } from './document';
import { walkSteps } from './step-path';

/** The order of a pass of a repeat that is shuffled: drawn from the seed of the run, so that it is the same whenever it is asked for. */

/** A plan that belongs to no run is drawn from this. */
const plannedSeed = 1;

/** Steps in the order in which they come. */
export interface OrderedSteps {
  steps: readonly Step[];
  /** Places in the document, from 0; null: as written. */
  order: readonly number[] | null;
}

/** Of a pass that begins. */
export interface PassOrder {
  /** `3.repeat[2]` */
  path: string;
  /** Numbers of the children in the document, from 1, as they come. */
  order: number[];
}

/** Does any repeat of the document draw its order? */
export const isShuffled = (document: Pick<ProtocolDocument, 'steps'>): boolean =>
  [...walkSteps(document.steps)].some(({ step }) => step.kind === 'repeat' && step.order === 'shuffled');

/** So many children a shuffled repeat may have: what each could leave is looked at before each of the others. */
export const MOST_SHUFFLED = 24;

/** How many children's orders are drawn in a pass, those of shuffled repeats inside it counted too. */
export const shuffledChildren = ({ steps }: Pick<RepeatStep, 'steps'>): number =>
  [...walkSteps(steps)].reduce(
    (count, { step }) => (step.kind === 'repeat' && step.order === 'shuffled' ? count + step.steps.length : count),
    steps.length,
  );

/** Number in the document, from 1, of the step that comes at a place, from 0. */
export const numberAt = ({ order }: OrderedSteps, place: number): number => (order?.[place] ?? place) + 1;

/** The steps of the pass with this path, `3.repeat[2]`, as they come. */
export function orderedPass({ steps, order }: RepeatStep, path: string, seed: number = plannedSeed): OrderedSteps {
  if (order !== 'shuffled') return { steps, order: null };
  const places = shuffledPlaces(steps.length, `${seed} ${path}`);
  return { steps: places.map((place) => steps[place] as Step), order: places };
}

/** The generator's first outputs hang on its seed too plainly. */
const outputsUnused = 16;

/** Every order is as likely as any other: Fisher and Yates's shuffle, the places drawn from the name's own stream. */
function shuffledPlaces(count: number, name: string): number[] {
  const random = xoroshiro128plus(hashOf(name));
  for (let output = 0; output < outputsUnused; output += 1) random.next();
  const places = Array.from({ length: count }, (_, place) => place);
  for (let last = count - 1; last > 0; last -= 1) {
    const other = uniformInt(random, 0, last);
    [places[last], places[other]] = [places[other] as number, places[last] as number];
  }
  return places;
}

/**
 * FNV-1a, 32 bits, and then MurmurHash3's finalizer. FNV alone would not do: its lowest bit is the parity of the name's characters,
 * and the generator's first output is the seed's complement, so that two children would change places with every pass.
 */
function hashOf(name: string): number {
  let hash = 0x811c9dc5;
  for (let index = 0; index < name.length; index += 1) hash = Math.imul(hash ^ name.charCodeAt(index), 0x01000193);
  hash = Math.imul(hash ^ (hash >>> 16), 0x85ebca6b);
  hash = Math.imul(hash ^ (hash >>> 13), 0xc2b2ae35);
  return (hash ^ (hash >>> 16)) | 0;
}
