import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import type { RunStart } from '@/shared/archive/run-records';
import type { InterruptionPolicy, ProtocolDocument } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { sha256Hex } from '@/server/evaluation/sha256';
import { asOfThePhone, type PhoneTime } from '../phone/phone-time';
import { phoneAheadMs } from '../phone/virtual-time';
import { NightPhone } from './night-phone';
import { World } from './world';

/** A night of a few minutes with everything that can go wrong, from a seed: line, controller, process, database, sensor, clock, people and a phone. */

export const startUtcMs = Date.UTC(2026, 2, 1, 22);
const TROUBLE_MS = 240_000;
/** The longest that is left of a run, and of faults that were begun, when all is well again. */
const HEALING_MS = 330_000;
const TOLD_MS = 10_000;
const restful = ['held', 'stopped', 'finished', 'failed'];
const MOST_DEEDS = 8;
const policies: InterruptionPolicy[] = ['hold', 'resume', 'stop'];

export interface Night {
  seed: number;
  policy: InterruptionPolicy;
  /** What was done to it, in order. */
  deeds: string[];
  world: World;
  /** State of the run when all is well again, before the last stop. */
  healed: string;
  stoodDeg: [number, number];
  /** SHA-256 of all that it left. */
  hash: string;
}

interface Dice {
  upTo(greatest: number): number;
  between(least: number, greatest: number): number;
}

type Deed = (world: World, dice: Dice) => string;

function outage(world: World, lastsMs: number): void {
  world.store.away = true;
  world.clock.after(lastsMs, () => {
    world.store.away = false;
  });
}

function killed(world: World, awayMs: number): void {
  world.kill();
  const tryAgain = () => void world.comeBack().then(() => world.alive || world.clock.after(1_000, tryAgain));
  world.clock.after(awayMs, tryAgain);
}

/** Waits until the process has died by itself, then brings the next one. */
function mourn(world: World, awayMs: number, leftMs = 60_000): void {
  if (!world.alive) return killed(world, awayMs);
  if (leftMs > 0) world.clock.after(250, () => mourn(world, awayMs, leftMs - 250));
}

function killedInWrite(world: World, when: 'before' | 'after', awayMs: number): void {
  const { store } = world;
  store.onCommit = (at) => {
    if (at !== when) return;
    store.onCommit = () => undefined;
    killed(world, awayMs);
    if (when === 'before') throw new Error('the process died');
  };
}

const deeds: Readonly<Record<string, Deed>> = {
  drop: ({ controller }, { between }) => {
    const ms = between(100, 40_000);
    controller.dropLine(ms);
    return `${ms} ms`;
  },
  garbage: ({ controller }, { between }) => {
    const ms = between(50, 6_000);
    controller.garbage(ms);
    return `${ms} ms`;
  },
  freeze: ({ controller }, { between }) => {
    const ms = between(50, 4_000);
    controller.freeze(ms);
    return `${ms} ms`;
  },
  unplug: ({ controller, clock }, { between }) => {
    const ms = between(100, 20_000);
    controller.unplug();
    clock.after(ms, () => controller.plug());
    return `${ms} ms`;
  },
  reset: (world) => {
    world.hazard('reset', 0);
    return '';
  },
  interlock: (world, { between }) => {
    const ms = between(20, 30_000);
    world.hazard('interlock', ms);
    return `${ms} ms`;
  },
  supply: (world, { between }) => {
    const ms = between(20, 30_000);
    world.hazard('supply', ms);
    return `${ms} ms`;
  },
  kill: (world, { between }) => {
    const ms = between(500, 20_000);
    if (world.alive) killed(world, ms);
    return `${ms} ms`;
  },
  'kill before a write': (world, { between }) => {
    const ms = between(500, 20_000);
    killedInWrite(world, 'before', ms);
    return `${ms} ms`;
  },
  'kill after a write': (world, { between }) => {
    const ms = between(500, 20_000);
    killedInWrite(world, 'after', ms);
    return `${ms} ms`;
  },
  'kill at a command': (world, { between, upTo }) => {
    const [ms, n] = [between(500, 20_000), upTo(2)];
    world.killAtSend(n);
    mourn(world, ms);
    return `${n}, ${ms} ms`;
  },
  outage: (world, { between }) => {
    const ms = between(100, 30_000);
    outage(world, ms);
    return `${ms} ms`;
  },
  'long outage': (world, { between }) => {
    const ms = between(30_000, 700_000);
    outage(world, ms);
    return `${ms} ms`;
  },
  'answers lost': ({ store }, { between }) => {
    store.loseAnswers = between(1, 4);
    return String(store.loseAnswers);
  },
  'clock step': ({ machineClock }, { between }) => {
    const ms = between(-5_000, 5_000);
    machineClock.stepMs += ms;
    return `${ms} ms`;
  },
  'sensor-gap': ({ room }, { between }) => {
    const ms = between(1_000, 90_000);
    room.fallSilent(ms);
    return `${ms} ms`;
  },
  burst: ({ room }, { between }) => {
    const ms = between(1_000, 60_000);
    room.warmUp(ms);
    return `${ms} ms`;
  },
  hold: (world) => {
    world.halt('hold');
    return '';
  },
  stop: (world) => {
    world.halt('stop');
    return '';
  },
  'hold after this dwell': (world) => {
    if (world.alive) world.driver.holdAfterDwell('Ben');
    return '';
  },
  resume: (world) => {
    world.resume();
    return '';
  },
};
/** People resume more often than they stop, else most nights would be short. */
const drawn = [...Object.keys(deeds), 'resume', 'resume', 'kill', 'outage', 'drop', 'hold'].filter((name) => name !== 'stop');

/** Every so many nights one has a prompt and a proof. */
const isAttended = (seed: number) => seed % 7 === 5;

/** A prompt on the way and a proof at the end; somebody confirms now and then, too early, in time or too late. */
function attend({ steps, ...protocol }: ProtocolDocument, { between }: Dice): ProtocolDocument {
  const prompt = {
    kind: 'prompt' as const,
    text: 'Look at the spot',
    atMost_s: between(20, 60),
    otherwise: between(0, 2) === 0 ? 'stop' : 'hold',
  } as const;
  const otherwise = (['hold', 'continue', 'stop'] as const)[between(0, 2)] ?? 'hold';
  return { ...protocol, steps: [...steps.slice(0, 4), prompt, ...steps.slice(4), { kind: 'proof', otherwise }] };
}

function protocolOf(policy: InterruptionPolicy, { between }: Dice): ProtocolDocument {
  const dwell = () => ({ kind: 'dwell' as const, for_s: between(3, 50) });
  return {
    formatVersion: 1,
    name: 'Seeded',
    onInterruption: policy,
    goodWhen: { channels: [{ channel: 'box temperature', below: 30 }] },
    steps: [
      { kind: 'home' },
      { kind: 'swing', to: 'near' },
      dwell(),
      { kind: 'mark', label: 'on the way' },
      { kind: 'wait', until: { channel: 'box temperature', below: 30, for_s: between(1, 10) }, atMost_s: 40, otherwise: 'continue' },
      {
        kind: 'repeat',
        times: 2,
        counting: 'good',
        atMost: 3,
        steps: [{ kind: 'swing', to: 'far' }, dwell(), { kind: 'swing', to: 'near' }, dwell()],
      },
    ],
  };
}

export const startOf = (protocol: ProtocolDocument): RunStart => ({
  labId: 'lab',
  runId: 'run-1',
  rigId: 'north-bench',
  rigName: 'North bench',
  rigRevision: 1,
  protocolName: protocol.name,
  protocolRevision: 1,
  rig: demoRigWide,
  protocol,
  massSetLabel: 'lead',
  timeZone: 'Europe/Oslo',
  operator: 'Ada Quill',
  notes: '',
  arm: { name: 'Ada Quill', untilUtcMs: startUtcMs + 16 * 3_600_000 },
  simulated: null,
});

/**
 * `withPhone`: somebody holds, stops and resumes from afar besides. `isArmed`: people arm the rig and lay hands into it, by the product's own rule. The other faults of a seed are
 * the same with and without.
 */
export async function runNight(seed: number, { withPhone = true, isArmed = false } = {}): Promise<Night> {
  const random = xoroshiro128plus(seed * 104_729 + 11);
  const between = (least: number, greatest: number) => uniformInt(random, least, greatest);
  const dice: Dice = { between, upTo: (greatest) => between(0, greatest) };
  const policy = policies[seed % 3] as InterruptionPolicy;
  const plain = protocolOf(policy, dice);
  const world = new World(startOf(isAttended(seed) ? attend(plain, dice) : plain), { seed, startUtcMs, isArmed });
  const phone = withPhone ? new NightPhone(world, seed) : null;
  const done: string[] = [];
  const tell = (words: string) => void done.push(`${world.nowMs.toFixed(0)} ms: ${words}`);
  const healed = await asOfThePhone(phoneTime(world), async () => {
    await world.begin();
    draws(world, { dice, attended: isAttended(seed), tell });
    phone?.begin(TROUBLE_MS, tell);
    world.rig?.visitors.begin(TROUBLE_MS, tell);
    return heals(world, phone);
  });
  world.halt('stop');
  await world.clock.advance(120_000, () => world.done);
  await world.clock.advance(3_000);
  const stood = world.angleDeg();
  await world.clock.advance(3_000);
  world.kill();
  const { store, witness } = world;
  const left = { events: store.events, rows: [...store.rows.values()], began: witness.began };
  return { seed, policy, deeds: done, world, healed, stoodDeg: [stood, world.angleDeg()], hash: sha256Hex(JSON.stringify(left)) };
}

const phoneTime = ({ clock }: World): PhoneTime => ({
  utcMs: () => clock.utcMs() + phoneAheadMs,
  after: (ms, task) => clock.after(ms, task),
});

/** Draws what will be done to the night. */
function draws(world: World, { dice, attended, tell }: { dice: Dice; attended: boolean; tell(words: string): void }): void {
  const { between } = dice;
  if (attended) for (let count = between(0, 6); count > 0; count -= 1) world.clock.after(between(0, TROUBLE_MS), () => world.confirm());
  for (let count = between(1, MOST_DEEDS); count > 0; count -= 1) {
    const name = between(0, 19) === 0 ? 'stop' : (drawn[between(0, drawn.length - 1)] as string);
    const [atMs, own] = [between(0, TROUBLE_MS), xoroshiro128plus(between(0, 2 ** 30))];
    const draw = (least: number, greatest: number) => uniformInt(own, least, greatest);
    world.clock.after(atMs, () => tell(`${name} ${deeds[name]?.(world, { between: draw, upTo: (greatest) => draw(0, greatest) }) ?? ''}`));
  }
}

/** The time of trouble, and after it; the state of the run then. */
async function heals(world: World, phone: NightPhone | null): Promise<string> {
  await world.clock.advance(TROUBLE_MS, () => world.alive && world.done);
  // Of a run that is over a page is told for a while yet.
  if (phone !== null) await world.clock.advance(TOLD_MS);
  world.heal();
  phone?.end();
  world.rig?.visitors.end();
  await world.clock.advance(HEALING_MS, () => world.alive && restful.includes(world.state));
  await world.comeBack();
  await world.clock.advance(5_000);
  return world.state;
}
