import * as contracts from '@/shared/contracts/standing';
import { cautionsText, cautionsVersion } from '@/shared/rig/cautions';
import type { ArmRequest } from '@/server/engine/arming';
import type { KeyTurn } from '@/server/engine/key-turns';
import { longestArmMs } from '@/server/store/arms';
import type { PersonalLock } from '@/server/interfaces/lock-keeper';
import type { RigStation } from '@/server/interfaces/rig-stations';
import { insertLock, liftLock, signaturesOf, signCautions, type LockRow } from '@/server/store/locks';
import { findRig, type RigRecord } from '@/server/store/rigs';
import { audited } from '../audited';
import { atTheRig, rigOfAddress } from '../desk/at-the-rig';
import { isoOf } from '../maker';
import { safeOnDisk } from '../safe-on-disk';
import { notFound, ProblemError } from '../problem-error';
import { armingViewOf, lockViewOf, signatureViewOf } from '../rig-view';
import { mount, type Membership, type SignedIn } from '../route-context';
import type { Services } from '../services';

type Caller = { me: SignedIn; membership: Membership; services: Services };

async function load({ membership, services }: Pick<Caller, 'membership' | 'services'>, rigId: string): Promise<RigRecord> {
  const rig = await findRig(services.database.db, membership.labId, rigId);
  if (rig === null) throw notFound('rig');
  return rig;
}

/** Whoever arms a rig or sets it in motion has signed the cautions for it, in their present words. */
export async function assertSigned({ me, services }: Pick<Caller, 'me' | 'services'>, rig: RigRecord): Promise<void> {
  const signatures = await signaturesOf(services.database.db, { labId: rig.labId, rigId: rig.id });
  if (signatures.some(({ userId, version }) => userId === me.userId && version === cautionsVersion)) return;
  throw new ProblemError(
    'not-signed',
    `You have not signed the cautions for ${rig.name} in their present words. Read and sign them first.`,
  );
}

const shortestArmMs = 60_000;

function armEnd(until: string, nowUtcMs: number): number {
  const untilUtcMs = Date.parse(until);
  const item = (message: string) => [{ path: 'until', message }];
  if (untilUtcMs < nowUtcMs + shortestArmMs)
    throw new ProblemError(
      'invalid-input',
      `The arm would end at ${until}, which is past or less than a minute ahead. Choose a later end.`,
      item('an instant in the future'),
    );
  if (untilUtcMs > nowUtcMs + longestArmMs)
    throw new ProblemError(
      'invalid-input',
      `The arm would end at ${until}, more than 72 h ahead. Nobody can answer for a rig for longer; choose an end before ${isoOf(nowUtcMs + longestArmMs)}.`,
      item('at most 72 h ahead'),
    );
  return untilUtcMs;
}

/** What must hold when arming begins; the door need not be closed yet, for whoever arms goes out through it. */
export function assertMayArm(
  services: Pick<Services, 'locks' | 'supervisor'> & { stations: { get(rigId: string): Pick<RigStation, 'link'> | null } },
  rig: Pick<RigRecord, 'id' | 'name'>,
): void {
  const lockedBy = services.locks.lockedBy(rig.id);
  if (lockedBy !== null) throw new ProblemError('locked', lockedBy);
  const driver = services.supervisor.activeOf(rig.id);
  const facts = driver === null || driver.isOver() ? null : driver.facts();
  if (facts !== null && facts.state !== 'held' && facts.waiting?.kind !== 'prompt')
    throw new ProblemError('rig-busy', `A run is under way on ${rig.name}. Hold or stop it, then arm the rig.`);
  const controller = services.stations.get(rig.id)?.link.controller() ?? null;
  if (controller === null)
    throw new ProblemError(
      'not-ready',
      `The controller of ${rig.name} does not answer, so nobody can say whether it is safe. See to the link first.`,
    );
  if (!controller.supplyPresent)
    throw new ProblemError('not-ready', `The motor supply of ${rig.name} is off. Switch it on at the rig, then arm.`);
}

const armRoutes = [
  mount(contracts.arm, async (context) => {
    const { body, params, me, services } = context;
    const rig = await load(context, params.rigId);
    const untilUtcMs = armEnd(body.until, services.clock.utcMs());
    assertMayArm(services, rig);
    await assertSigned(context, rig);
    const by = { id: me.userId, name: me.name };
    const request: ArmRequest = { labId: rig.labId, rigId: rig.id, rigName: rig.name, name: body.name, note: body.note, untilUtcMs, by };
    const entry = { kind: 'rig.arming-asked', data: () => ({ rigId: rig.id, name: body.name, until: body.until }) };
    await audited(context, entry, async () => undefined);
    services.arms.end(request, 'it is armed anew', by);
    return armingViewOf(services.arming.begin(request));
  }),

  mount(contracts.disarm, async (context) => {
    const { services, me } = context;
    const rig = await load(context, context.params.rigId);
    if (services.arming.of(rig.id) !== null) {
      services.arming.end(rig.id, `${me.name} ended it before the exit delay was over`);
      return undefined;
    }
    if (services.arms.armOf(rig.id) === null) throw new ProblemError('not-found', `${rig.name} is not armed.`);
    services.arms.end({ labId: rig.labId, rigId: rig.id }, `disarmed by ${me.name}`, { id: me.userId, name: me.name });
    await safeOnDisk(services.arms.kept(), services.clock);
    return undefined;
  }),

  mount(contracts.turnVirtual, async (context) => {
    const { body, params, services } = context;
    const rig = await load(context, params.rigId);
    const virtual = services.stations.get(rig.id)?.virtual ?? null;
    if (virtual === null)
      throw new ProblemError(
        'not-possible-now',
        `The arm key and the door of ${rig.name} are real. They are turned and closed at the rig.`,
      );
    await audited(context, { kind: 'rig.virtual-turned', data: () => ({ rigId: rig.id, ...body }) }, async () => undefined);
    if ('armKey' in body) virtual.turnKey(body.armKey === 'on');
    else virtual.setDoor(body.door === 'closed');
    return undefined;
  }),
];

const signRoutes = [
  mount(contracts.signCautions, async (context) => {
    const { body, params, me, services } = context;
    const rig = await load(context, params.rigId);
    if (body.version !== cautionsVersion)
      throw new ProblemError(
        'edited-meanwhile',
        `The cautions have other words now (version ${String(cautionsVersion)}). Read them as they are, then sign.`,
      );
    const signature = {
      ...{ labId: rig.labId, rigId: rig.id, userId: me.userId, name: me.name, version: body.version },
      textHash: services.sha256(cautionsText()),
      signedAt: services.clock.utcMs(),
    };
    const entry = { kind: 'rig.cautions-signed', data: () => ({ rigId: rig.id, version: body.version, textHash: signature.textHash }) };
    return signatureViewOf(await audited(context, entry, (tx) => signCautions(tx, signature)));
  }),
];

type LockCaller = Caller & { params: { rigId: string; lockId: string } };

function lockOf({ params, services }: LockCaller): PersonalLock {
  const lock = services.locks.locksOf(params.rigId).find(({ id }) => id === params.lockId);
  if (lock === undefined) throw notFound('personal lock');
  return lock;
}

/** Lifts a lock in the database, then here. */
async function lift(context: LockCaller, why: string | null): Promise<void> {
  const { params, me, services } = context;
  const rig = await load(context, params.rigId);
  const { setUtcMs: setAt, ...lock } = lockOf(context);
  const asked = { labId: rig.labId, rigId: rig.id, lockId: params.lockId, by: me.name, why, nowUtcMs: services.clock.utcMs() };
  const entry = {
    kind: why === null ? 'rig.lock-lifted' : 'rig.lock-overridden',
    data: (row: LockRow) => ({ rigId: rig.id, lockId: row.id, of: row.name, ...(why === null ? {} : { reason: why }) }),
  };
  await audited(context, entry, async (tx) => {
    // One that was set while the database was away may not be stored yet.
    await insertLock(tx, { ...lock, setAt });
    const row = await liftLock(tx, asked);
    if (row === null) throw notFound('personal lock');
    return row;
  });
  services.locks.lifted(rig.id, params.lockId);
}

/** A lock is lifted at the rig: a turn of its arm key since the lock was set shows it, for a tap alone could come from anywhere. */
function assertAtTheRig({ stations, keyTurns }: Services, rig: RigRecord, setUtcMs: number): KeyTurn {
  const turn = keyTurns.take(rig.id, setUtcMs);
  if (turn !== null) return turn;
  const answers = stations.get(rig.id)?.link.health().condition === 'ready';
  throw new ProblemError(
    'not-ready',
    answers
      ? `A personal lock is lifted at the rig: turn the arm key of ${rig.name}, on or off, and lift the lock within 2 min.`
      : `The controller of ${rig.name} does not answer, so its arm key cannot show that you are at the rig. See to the link first; an owner of the lab may lift the lock with a reason.`,
  );
}

const setLockRoutes = [
  mount(contracts.setLock, async (context) => {
    const { body, params, me, services } = context;
    const { labId } = context.membership;
    // A rig with a line is known without the database: hands come first.
    const rigId = services.stations.get(params.rigId)?.labId === labId ? params.rigId : (await load(context, params.rigId)).id;
    const setUtcMs = services.clock.utcMs();
    const lock = services.locks.set({ labId, rigId, userId: me.userId, name: me.name, note: body.note, setUtcMs });
    // The lock, and the end of the arm that it brings.
    await safeOnDisk(Promise.all([services.locks.kept(), services.arms.kept()]), services.clock);
    return lockViewOf(lock);
  }),
];

const liftRoutes = [
  mount(contracts.liftLock, async (context) => {
    const rig = await load(context, context.params.rigId);
    const { userId, name, setUtcMs } = lockOf(context);
    if (userId !== context.me.userId)
      throw new ProblemError(
        'not-allowed',
        `This is the personal lock of ${name}. Only ${name} lifts it, or an owner of the lab with a reason.`,
      );
    const turn = assertAtTheRig(context.services, rig, setUtcMs);
    try {
      await lift(context, null);
    } catch (error) {
      context.services.keyTurns.giveBack(rig.id, turn);
      throw error;
    }
    return undefined;
  }),

  mount(contracts.overrideLock, async (context) => {
    await lift(context, context.body.reason);
    return undefined;
  }),
];

export const armingRoutes = [
  ...signRoutes,
  ...atTheRig(rigOfAddress, [...armRoutes, ...liftRoutes]),
  ...atTheRig(rigOfAddress, setLockRoutes, { urgent: true }),
];
