import type { Edge } from '@/server/links/board/emulated-board';

/** What the STEP, DIR and EN pins did in one motion, judged from the edges alone. Rates in microsteps per s and s². */

const CYCLES_PER_S = 16_000_000;
/** The timer makes the edges, so nothing jitters; what is left is its tick and the rounding of intervals, cycles. */
const JITTER_CYCLES = 32;
/** A step that was planned while the line was heard may come this much late; windows are made so long that it does not matter. */
const LATE_CYCLES = 100;
const MEAN_STEPS = 20;
const MOST_MEAN_SPEED = 1.002;
const MOST_ACCELERATION = 1.06;
const LEAST_WINDOW = 8;
const LEAST_PULSE_US = 2;
/** The step after it is planned while the line is heard, in the pulse; at 8000 steps/s, 125 µs, it must still end 5 µs before the next. */
const MOST_PULSE_US = 120;
const LEAST_SETUP_US = 5;
const LEAST_END_INTERVAL = 0.95;

export interface Motion {
  edges: readonly Edge[];
  /** Levels before the first edge. */
  directionBefore: boolean;
  enableBefore: boolean;
  from: number;
  /** Null when it was stopped on its way. */
  target: number | null;
  /** Where the controller says that it ended. */
  reportedEnd: number;
  /** Where the table stands. */
  placeEnd: number;
  speed: number;
  acceleration: number;
  /** The steepest that it may brake with. */
  steepest: number;
}

/** What is wrong with a motion, in words; nothing when it is right. */
export function judge(motion: Motion): string[] {
  const { edges, from, target, reportedEnd, placeEnd, speed } = motion;
  const rises = edges.filter(({ pin, level }) => pin === 'step' && level).map(({ cycle }) => cycle);
  const counted = countOf(motion);
  const wrong: string[] = [];
  const expectThat = (right: boolean, words: string) => void (right || wrong.push(words));
  expectThat(from + counted === reportedEnd, `the pins made ${counted} steps from ${from}, the controller says ${reportedEnd}`);
  expectThat(target === null || target === reportedEnd, `it was to go to ${target} and says ${reportedEnd}`);
  expectThat(placeEnd === reportedEnd, `the table stands at ${placeEnd}, the controller says ${reportedEnd}`);
  expectThat(rises.length === Math.abs(counted), 'it stepped to both sides');
  const shortest = Math.min(...intervalsOf(rises));
  expectThat(shortest >= CYCLES_PER_S / speed - JITTER_CYCLES, `an interval of ${shortest} cycles is faster than ${speed}/s`);
  const mean = greatestMean(rises);
  expectThat(mean <= MOST_MEAN_SPEED * speed, `${mean}/s over ${MEAN_STEPS} steps is faster than ${speed}/s`);
  return [...wrong, ...steepnessOf(rises, motion), ...pulsesOf(edges), ...directionOf(motion, rises[0])];
}

const intervalsOf = (cycles: readonly number[]) => cycles.slice(1).map((cycle, index) => cycle - (cycles[index] as number));

/** Steps to the side that DIR shows, while EN lets the driver step. */
function countOf({ edges, directionBefore, enableBefore }: Motion): number {
  let direction = directionBefore;
  let enable = enableBefore;
  let count = 0;
  for (const { pin, level } of edges) {
    if (pin === 'direction') direction = level;
    else if (pin === 'enable') enable = level;
    else if (pin === 'step' && level && !enable) count += direction ? 1 : -1;
  }
  return count;
}

function greatestMean(rises: readonly number[]): number {
  let greatest = 0;
  for (let index = MEAN_STEPS; index < rises.length; index += 1)
    greatest = Math.max(greatest, (MEAN_STEPS * CYCLES_PER_S) / ((rises[index] as number) - (rises[index - MEAN_STEPS] as number)));
  return greatest;
}

/** Speeds of two windows that follow each other; a window grows with the speed, so that a tick is not taken for a push. */
function steepnessOf(rises: readonly number[], { acceleration, steepest }: Motion): string[] {
  const wrong: string[] = [];
  const at = (index: number) => (rises[index] as number) / CYCLES_PER_S;
  for (let index = 0; index + 2 * LEAST_WINDOW < rises.length; index += 1) {
    const speed = LEAST_WINDOW / (at(index + LEAST_WINDOW) - at(index));
    const window = Math.max(LEAST_WINDOW, Math.ceil(Math.sqrt(20 * (LATE_CYCLES / CYCLES_PER_S) * (speed ** 3 / acceleration))));
    if (index + 2 * window >= rises.length) continue;
    const [first, second] = [at(index + window) - at(index), at(index + 2 * window) - at(index + window)];
    const push = (window / second - window / first) / ((first + second) / 2);
    if (push > MOST_ACCELERATION * acceleration) wrong.push(`it accelerates with ${push}/s² instead of ${acceleration}/s²`);
    if (-push > MOST_ACCELERATION * steepest) wrong.push(`it brakes with ${-push}/s² instead of ${steepest}/s²`);
    if (wrong.length > 0) return wrong;
  }
  const intervals = intervalsOf(rises);
  const first = intervals[0] ?? Infinity;
  const last = intervals.at(-1) ?? Infinity;
  const slowest = (rate: number) => LEAST_END_INTERVAL * Math.sqrt(2 / rate) * CYCLES_PER_S;
  if (first < slowest(acceleration)) wrong.push(`it begins with an interval of ${first} cycles`);
  if (last < slowest(steepest)) wrong.push(`it ends with an interval of ${last} cycles: a dead stop`);
  return wrong;
}

function pulsesOf(edges: readonly Edge[]): string[] {
  const steps = edges.filter(({ pin }) => pin === 'step');
  for (let index = 0; index < steps.length; index += 1) {
    const [edge, next] = [steps[index] as Edge, steps[index + 1]];
    if (!edge.level) continue;
    const widthUs = ((next?.cycle ?? Infinity) - edge.cycle) / 16;
    if (next?.level !== false || widthUs < LEAST_PULSE_US || widthUs > MOST_PULSE_US) return [`a pulse of ${widthUs} µs`];
  }
  return [];
}

function directionOf({ edges }: Motion, firstCycle = 0): string[] {
  const turns = edges.filter(({ pin }) => pin === 'direction');
  const late = turns.filter(({ cycle }) => cycle > firstCycle - LEAST_SETUP_US * 16);
  return late.length === 0 ? [] : ['DIR changed less than 5 µs before the first step, or in the motion'];
}
