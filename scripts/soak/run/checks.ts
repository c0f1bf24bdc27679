import { verifyChain } from '@/shared/archive/chain';
import { sha256Hex } from '@/server/evaluation/sha256';
import type { SeededKinds } from '../seeded/try-seeds';
import { armChecks } from './arm-checks';
import { runNight, type Night } from './night';
import type { Witness } from './world';

/** What must hold on every night; each tells what is wrong, or nothing. They look from outside: at the controller, the database, what people were told. */
type Check = (night: Night) => string | null;

/** A line takes some milliseconds, and an order that was written before a hold may still be on it. */
const ON_THE_LINE_MS = 60;
/** What was under way at the controller when an input opened is over by then. */
const AFTER_HAZARD_MS = 250;

/** Each command moves at most once, whatever was repeated or restarted. */
const atMostOnce: Check = ({ world }) => {
  const tags = world.witness.began.map(({ tag }) => tag);
  const twice = tags.find((tag, index) => tags.indexOf(tag) !== index);
  return twice === undefined ? null : `the motion ${twice} began twice`;
};

/** The step log has every row, each once, and all are closed in the end. */
const wholeLog: Check = ({ world: { store } }) => {
  const rows = [...store.rows.values()].sort((a, b) => a.seq - b.seq);
  const gap = rows.findIndex(({ seq }, index) => seq !== index + 1);
  if (gap >= 0) return `the row ${gap + 1} is missing`;
  const open = rows.find(({ outcome }) => outcome === null);
  if (open !== undefined) return `the row ${open.seq} was never closed`;
  const began = store.events.filter(({ kind }) => kind === 'step-began').length;
  return began === rows.length ? null : `${began} steps began in the log, and there are ${rows.length} rows`;
};

const chainHolds: Check = ({ world: { store } }) => {
  const verdict = verifyChain(store.events, sha256Hex);
  return verdict.valid ? null : `the chain does not hold: ${JSON.stringify(verdict)}`;
};

/** What somebody was told stands in the database in the end, word for word. */
const nothingLost: Check = ({ world: { store, witness } }) => {
  const kept = new Map(store.events.map(({ seq, hash }) => [seq, hash]));
  for (const [seq, hash] of witness.told) if (kept.get(seq) !== hash) return `event ${seq}, which was told, is not in the database`;
  return null;
};

/** A tap counts for 5 s by the server's clock, which may have been set since. */
const isLate = ({ ageMs, setMs }: Witness['resumesFromAfar'][0]) => ageMs > 5_000 + setMs;

/** When people resumed, from near or far, ms. */
const resumesOf = ({ resumes, resumesFromAfar }: Witness): number[] =>
  [...resumes, ...resumesFromAfar.filter((one) => one.acted && !isLate(one)).map(({ atMs }) => atMs)].sort((a, b) => a - b);

const timesIn = ({ store }: Night['world'], kind: string, by: string) =>
  store.events.filter((event) => event.kind === kind && event.data['by'] === by).length;

/** A resume that comes later than 5 s after its tap does nothing; one that comes twice counts once. */
const noLateResume: Check = ({ world }) => {
  const { resumesFromAfar } = world.witness;
  for (const { by, atMs, ageMs } of resumesFromAfar) {
    const inTime = resumesFromAfar.some((one) => one.by === by && !isLate(one));
    const times = timesIn(world, 'resumed', by);
    if (times > Number(inTime)) return `"${by}" resumed ${times} times, at ${atMs.toFixed(0)} ms it was ${ageMs.toFixed(0)} ms old`;
  }
  return null;
};

/** A stop from afar that was answered is in the log once, and the run is stopped once, however often it was sent; no act from afar is there twice. */
const acknowledgedOnce: Check = ({ world }) => {
  const { acknowledged } = world.witness;
  for (const { act, by } of acknowledged) {
    const times = timesIn(world, `${act}-requested`, by);
    if (times > 1 || (act === 'stop' && times === 0)) return `the ${act} of "${by}", which was answered, is in the log ${times} times`;
  }
  const stopped = world.store.events.filter(({ kind }) => kind === 'stopped').length;
  return acknowledged.some(({ act }) => act === 'stop') && stopped !== 1 ? `the run was stopped ${stopped} times` : null;
};

/** No page says "Stopped" before the controller has confirmed that the table stands; and from then on it stands. */
const saidWhenConfirmed: Check = ({ world: { store, witness }, stoodDeg }) => {
  for (const { atMs, angleDeg } of witness.stoppedSaid) {
    if (!store.events.some(({ kind, data }) => kind === 'stopped' && data['confirmed'] === true))
      return `the page said at ${atMs.toFixed(0)} ms that it stopped, which nobody confirmed`;
    const began = witness.began.find((motion) => motion.atMs > atMs);
    if (angleDeg !== stoodDeg[0] || began !== undefined)
      return `the page said at ${atMs.toFixed(0)} ms that it stopped, at ${angleDeg} deg, and it came to ${stoodDeg[0]} deg`;
  }
  return null;
};

/** No order of motion goes out after a stop that was answered, nor after a hold before somebody resumes. */
const restsAfterHalt: Check = ({ world: { witness } }) => {
  for (const { kind, atMs } of witness.halts) {
    const untilMs = kind === 'stop' ? Infinity : (resumesOf(witness).find((resumeMs) => resumeMs >= atMs) ?? Infinity);
    const late = witness.ordered.find((order) => order.atMs > atMs + ON_THE_LINE_MS && order.atMs < untilMs);
    if (late !== undefined)
      return `the motion ${late.tag} was ordered at ${late.atMs.toFixed(0)} ms, after the ${kind} of ${atMs.toFixed(0)} ms`;
  }
  return null;
};

/** After a restart of the controller, an opened interlock or a lost supply nothing moves before a person resumes who was at the rig, or for whom somebody was. */
const restsAfterHazard: Check = ({ world: { witness, rig } }) => {
  for (const { kind, atMs } of witness.hazards) {
    const resumes = rig === null ? witness.resumes : resumesOf(witness);
    const untilMs = resumes.find((resumeMs) => resumeMs >= atMs) ?? Infinity;
    const moved = witness.began.find((motion) => motion.atMs > atMs + AFTER_HAZARD_MS && motion.atMs < untilMs);
    if (moved !== undefined) return `the motion ${moved.tag} began at ${moved.atMs.toFixed(0)} ms, after ${kind} at ${atMs.toFixed(0)} ms`;
  }
  return null;
};

/** When all is well again a run has decided: it goes on, is held or is over; and the last stop ends it. */
const comesToAnEnd: Check = ({ healed, world, stoodDeg }) => {
  if (['interrupted', 'holding', 'stopping', 'starting'].includes(healed)) return `with everything well again the run is still ${healed}`;
  if (!world.over) return `after the last stop the run is ${world.state}`;
  return stoodDeg[0] === stoodDeg[1] ? null : `the table moved from ${stoodDeg[0]} to ${stoodDeg[1]} deg after the end`;
};

/** A run that finished made as many passes as it took for two good ones, three at most, and the log says of each dwell that is not good why. */
const goodPassesCounted: Check = ({ world: { store }, healed }) => {
  const dwells = [...store.rows.values()].filter(({ kind, outcome }) => kind === 'dwell' && outcome === 'done');
  const told = new Set(store.events.filter(({ kind }) => kind === 'dwell-not-good').map(({ data }) => data['seq']));
  const silent = dwells.find(({ good, seq }) => good === told.has(seq));
  if (silent !== undefined) return `the dwell ${silent.seq} is ${String(silent.good)}, and the log says otherwise`;
  if (healed !== 'finished') return null;
  const passes = [1, 2, 3].map((pass) => dwells.filter(({ path }) => path.includes(`.repeat[${pass}].`)));
  const made = passes.filter(({ length }) => length > 0).length;
  const good = passes.slice(0, made).map((rows) => rows.length === 2 && rows.every((row) => row.good === true));
  const wanted = good[0] === true && good[1] === true ? 2 : 3;
  return made === wanted ? null : `${made} passes were made, of which good: ${good.join(', ')}`;
};

const checks: Readonly<Record<string, Check>> = {
  goodPassesCounted,
  atMostOnce,
  wholeLog,
  chainHolds,
  nothingLost,
  restsAfterHalt,
  restsAfterHazard,
  noLateResume,
  acknowledgedOnce,
  saidWhenConfirmed,
  comesToAnEnd,
};

/** What is wrong with a night, with all that is needed to look at it again. */
export function wrongWith(night: Night): string[] {
  return Object.entries({ ...checks, ...armChecks }).flatMap(([name, check]) => {
    const wrong = check(night);
    return wrong === null ? [] : [`seed ${night.seed} (${night.policy}; ${night.deeds.join('; ')}), ${name}: ${wrong}`];
  });
}

export const nightKinds = {
  night: { attempt: async (seed: number) => wrongWith(await runNight(seed)), first: 20_000, second: 1_000_000 },
  'night without a phone': {
    attempt: async (seed: number) => wrongWith(await runNight(seed, { withPhone: false })),
    first: 1_000,
    second: 10_000,
  },
  'armed night': {
    attempt: async (seed: number) => wrongWith(await runNight(seed, { isArmed: true })),
    first: 20_000,
    second: 1_000_000,
  },
} satisfies SeededKinds;
