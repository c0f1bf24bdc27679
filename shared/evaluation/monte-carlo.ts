import { seededStreams } from '../physics/seeded-gaussian';
import { drawn, type Law } from '../statistics/draws';
import { gOfCore, setterOf, type Setter, type TrialCore } from './trial-core';

/** Propagation of distributions (JCGM 101:2008): G of inputs drawn from what is known of each. Plain data, so that threads can share it. */

export interface TrialInput {
  input: string;
  value: number;
  u: number;
  law: Law;
  /** Inputs of one group share their deviate. */
  group: string | null;
  /** ∂ ln G/∂input of the whole evaluation. */
  logSlope: number;
  /** Deviates of inputs, its own last, that its deviate is made of; absent: its own alone. */
  mix?: { input: string; factor: number }[];
}

export interface TrialModel {
  bigG: number;
  inputs: TrialInput[];
  /** Null where G answers to its inputs in proportion closely enough. */
  core: TrialCore | null;
}

export interface MonteCarloResult {
  trials: number;
  /** Null where an input has one degree of freedom or less: then there is no mean to tend to. */
  G_mean: number | null;
  /** Null where an input has two degrees of freedom or less, whose distribution has no standard deviation, or from one trial. */
  G_u: number | null;
  /** Null from fewer trials than tell its ends. */
  interval95: [number, number] | null;
  /** Standard uncertainty of its ends, from the number of trials. */
  interval95_u: [number, number] | null;
}

const seed = 20220;
/** Trials that share a stream of random numbers, so that the outcome does not depend on how they are spread over threads. */
export const trialsPerBlock = 10_000;

/** G of the trials in the blocks from `fromBlock` to before `toBlock`, `trials` in all the blocks together. */
export function drawTrials(model: TrialModel, { trials, fromBlock, toBlock }: TrialSpan): Float64Array {
  const values = new Float64Array(Math.min(trials, toBlock * trialsPerBlock) - fromBlock * trialsPerBlock);
  const trial = trialOf(model);
  const streams = seededStreams(seed, toBlock).slice(fromBlock);
  for (let k = 0; k < values.length; k += 1) {
    const stream = streams[Math.floor(k / trialsPerBlock)] as (typeof streams)[number];
    values[k] = trial((law) => drawn(law, stream));
  }
  return values;
}

export interface TrialSpan {
  trials: number;
  fromBlock: number;
  toBlock: number;
}

export const blocksOf = (trials: number) => Math.ceil(trials / trialsPerBlock);

/** Fewest trials with one beyond each end of the 95 % interval. */
const fewestForInterval = 40;

/** Mean, standard deviation and probabilistically symmetric 95 % interval, so far as the inputs have them. Sorts the values in place. */
export function summarised(values: Float64Array, inputs: readonly Pick<TrialInput, 'law' | 'u'>[]): MonteCarloResult {
  const trials = values.length;
  const first = values[0] as number;
  const mean = first + values.reduce((sum, value) => sum + (value - first), 0) / trials;
  const squares = values.reduce((sum, value) => sum + (value - mean) ** 2, 0);
  values.sort();
  const at = (share: number) => values[Math.min(trials - 1, Math.max(0, Math.round(share * trials - 0.5)))] as number;
  // How many of the trials lie below an end is binomial, whatever their distribution is.
  const uAt = (share: number) => {
    const width = Math.sqrt((share * (1 - share)) / trials);
    return (at(share + width) - at(share - width)) / 2;
  };
  const leastNu = Math.min(...inputs.map(({ law, u }) => (law.kind === 't' && u > 0 ? law.nu : Infinity)));
  return {
    trials,
    G_mean: leastNu > 1 ? mean : null,
    G_u: leastNu > 2 && trials > 1 ? Math.sqrt(squares / (trials - 1)) : null,
    interval95: trials < fewestForInterval ? null : [at(0.025), at(0.975)],
    interval95_u: trials < fewestForInterval ? null : [uAt(0.025), uAt(0.975)],
  };
}

/** All trials in this thread; null for none. */
export function monteCarlo(model: TrialModel, trials: number): MonteCarloResult | null {
  return trials === 0 ? null : summarised(drawTrials(model, { trials, fromBlock: 0, toBlock: blocksOf(trials) }), model.inputs);
}

interface Part {
  input: TrialInput;
  set: Setter | null;
  /** What the closed form lacks of the whole evaluation's ∂ ln G/∂input. */
  lacking: number;
  /** Positions of the deviates, each with its factor. */
  draws: { at: number; factor: number }[];
}

function trialOf(model: TrialModel): (draw: (law: Law) => number) => number {
  const core = model.core === null ? null : structuredClone(model.core);
  const reference = core === null ? 1 : gOfCore(core);
  const { laws, parts } = partsOf(model, core, reference);
  const deviates = new Float64Array(laws.length);
  return (draw) => {
    for (let k = 0; k < laws.length; k += 1) deviates[k] = draw(laws[k] as Law);
    let exponent = 0;
    for (const { input, set, lacking, draws } of parts) {
      let deviate = 0;
      for (const { at, factor } of draws) deviate += factor * (deviates[at] as number);
      const change = input.u * deviate;
      set?.(input.value + change);
      exponent += lacking * change;
    }
    return model.bigG * (core === null ? 1 : gOfCore(core) / reference) * Math.exp(exponent);
  };
}

function partsOf(model: TrialModel, core: TrialCore | null, reference: number): { laws: Law[]; parts: Part[] } {
  const laws: Law[] = [];
  const groups = new Map<string, number>();
  const drawOf = new Map<string, number>();
  const parts = model.inputs
    .filter(({ u }) => u > 0)
    .map((input): Part => {
      const set = core === null ? null : setterOf(core, input.input);
      const known = input.group === null ? undefined : groups.get(input.group);
      const draw = known ?? laws.push(input.law) - 1;
      if (input.group !== null) groups.set(input.group, draw);
      drawOf.set(input.input, draw);
      const mix = input.mix ?? [{ input: input.input, factor: 1 }];
      // What is known exactly draws nothing, so nothing errs together with it.
      const draws = mix.flatMap(({ input: name, factor }) => {
        const place = drawOf.get(name);
        return place === undefined ? [] : [{ at: place, factor }];
      });
      return {
        input,
        set,
        draws,
        lacking: input.logSlope - (core === null || set === null ? 0 : slopeOf(core, input, { set, reference })),
      };
    });
  return { laws, parts };
}

/** ∂ ln/∂input of the closed form; the core is left as it was. */
function slopeOf(core: TrialCore, { value, u }: TrialInput, { set, reference }: { set: Setter; reference: number }): number {
  const step = 1e-3 * u;
  const at = (x: number) => {
    set(x);
    return gOfCore(core);
  };
  const slope = (at(value + step) - at(value - step)) / (2 * step * reference);
  set(value);
  return slope;
}
