import { exitDelayMs, type RigWitness } from './armed-rig';
import { startUtcMs, type Night } from './night';

/**
 * Nothing moves unless somebody answers for the rig and nobody's hands are in it. What is allowed is judged here by the rule of arming alone and by what truly happened at the
 * rig: its key, its door, its supply, its restarts, and what people were answered.
 */

type Change = RigWitness['changes'][0]['what'];

/** How long a server may not know of it yet. Doors, supplies and restarts stop the controller itself; the rest goes through a server, or through the lease. */
const KNOWN_WITHIN_MS: Readonly<Record<Change | 'person', number>> = { door: 250, supply: 250, reset: 250, key: 7_000, person: 2_300 };
const KEY_WAIT_MS = 600_000;
/** The server's clock is set by 5 s at a time, eight times at most. */
const CLOCK_MS = 40_000;
const ON_THE_LINE_MS = 60;
const LIFT_WITHIN_MS = 120_000;

/** Whether an arm may stand at an instant. */
function mayStand({ changes, asked, ended, prompts, locks }: RigWitness, atMs: number): boolean {
  const before = (what: Change, from: number, on: boolean) =>
    changes.some((one) => one.what === what && one.on === on && one.atMs > from && one.atMs < atMs - KNOWN_WITHIN_MS[what]);
  const byPeople = [...ended, ...asked, ...locks.map(({ setMs }) => ({ atMs: setMs }))];
  const lastOpening = changes.findLast((one) => one.what === 'door' && !one.on && one.atMs < atMs - KNOWN_WITHIN_MS.door);
  const closedMs =
    lastOpening === undefined
      ? -Infinity
      : (changes.find((one) => one.what === 'door' && one.on && one.atMs >= lastOpening.atMs)?.atMs ?? Infinity);
  const keyOn = changes.filter((one) => one.what === 'key' && one.on);
  return asked.some((request) =>
    keyOn.some(({ atMs: turnedMs }) => {
      const standsMs = turnedMs + exitDelayMs;
      if (turnedMs < request.atMs || turnedMs > request.atMs + KEY_WAIT_MS || standsMs > atMs) return false;
      if (atMs > request.untilUtcMs - startUtcMs + CLOCK_MS + KNOWN_WITHIN_MS.person) return false;
      if (closedMs > standsMs + KNOWN_WITHIN_MS.key) return false;
      if (before('key', turnedMs, false) || before('supply', turnedMs, false) || before('reset', turnedMs, true)) return false;
      if (prompts.some((one) => one.atMs > standsMs && one.atMs < atMs - KNOWN_WITHIN_MS.person)) return false;
      return !byPeople.some((one) => one.atMs > turnedMs && one.atMs < atMs - KNOWN_WITHIN_MS.person);
    }),
  );
}

const seconds = (ms: number) => `${ms.toFixed(0)} ms`;

/** No motion without an arm that stands. */
function movesArmed({ world: { rig, witness } }: Night): string | null {
  if (rig === null) return null;
  const moved = witness.began.find(({ atMs }) => !mayStand(rig.witness, atMs));
  return moved === undefined ? null : `the motion ${moved.tag} began at ${seconds(moved.atMs)}, and nobody answered for the rig`;
}

/** After a personal lock was answered nothing is ordered, and nothing begins, until it is lifted. */
function restsUnderLock({ world: { rig, witness } }: Night): string | null {
  for (const { id, atMs, liftedMs } of rig?.witness.locks ?? []) {
    const within = (of: number, spareMs: number) => of > atMs + spareMs && of < (liftedMs ?? Infinity);
    const ordered = witness.ordered.find((order) => within(order.atMs, ON_THE_LINE_MS));
    const moved = witness.began.find((motion) => within(motion.atMs, KNOWN_WITHIN_MS.person));
    if (ordered !== undefined) return `the motion ${ordered.tag} was ordered at ${seconds(ordered.atMs)}, under ${id} of ${seconds(atMs)}`;
    if (moved !== undefined) return `the motion ${moved.tag} began at ${seconds(moved.atMs)}, under ${id} of ${seconds(atMs)}`;
  }
  return null;
}

/** Whoever lifted a lock had turned the key at the rig since it was set. */
function liftedAtTheRig({ world: { rig } }: Night): string | null {
  const { locks = [], changes = [] } = rig?.witness ?? {};
  for (const { id, setMs, liftedMs } of locks) {
    if (liftedMs === null) continue;
    const from = Math.max(setMs, liftedMs - LIFT_WITHIN_MS - KNOWN_WITHIN_MS.key);
    if (!changes.some((one) => one.what === 'key' && one.atMs >= from && one.atMs < liftedMs))
      return `${id} of ${seconds(setMs)} was lifted at ${seconds(liftedMs)}, and nobody had turned the key`;
  }
  return null;
}

/** A lock that was answered outlives every process until it is lifted. */
function locksAreKept({ world: { rig } }: Night): string | null {
  const kept = new Set(rig?.kept.locks.map(({ id }) => id));
  const lost = rig?.witness.locks.find(({ id, liftedMs }) => liftedMs === null && !kept.has(id));
  return lost === undefined ? null : `${lost.id} of ${seconds(lost.atMs)} is gone, and nobody lifted it`;
}

/** The start of the night begins at its instant where the rig is armed, else it is refused with a reason. */
function startsInTime({ world: { rig } }: Night): string | null {
  if (rig === null) return null;
  const { start } = rig.witness;
  if (start === null) return 'nothing became of the start';
  if (start.beganMs === null && start.why === '') return 'the start was missed without a word';
  return start.beganMs === null || start.beganMs === start.dueMs
    ? null
    : `the start of ${seconds(start.dueMs)} began at ${seconds(start.beganMs)}`;
}

export const armChecks: Readonly<Record<string, (night: Night) => string | null>> = {
  movesArmed,
  restsUnderLock,
  liftedAtTheRig,
  locksAreKept,
  startsInTime,
};
