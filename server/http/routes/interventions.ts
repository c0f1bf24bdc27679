import * as goingOn from '@/shared/contracts/going-on';
import * as reviewContracts from '@/shared/contracts/reviews';
import * as contracts from '@/shared/contracts/runs';
import { formatDegrees } from '@/shared/lib/format-angle';
import type { LeafStep } from '@/shared/protocol/cursor';
import { turnsWords } from '@/shared/protocol/rotation';
import type { RigDocument } from '@/shared/rig/document';
import { resumePlan, skipPlan, type RemainingPlan } from '@/server/engine/remaining-plan';
import type { RunDriver } from '@/server/engine/run-driver';
import type { Answer } from '@/server/engine/run-driver-parts';
import { StaleRunError } from '@/server/interfaces/run-store';
import { isPassing } from '@/server/store/failures';
import { findRevision } from '@/server/store/protocols';
import { findMassSet, findRig } from '@/server/store/rigs';
import * as store from '@/server/store/runs-read';
import { auditLater } from '../audited';
import { assertFreshTap, type Caller } from '../begin-run';
import { atTheRig, rigOfAddress, rigOfItsRun } from '../desk/at-the-rig';
import { isoOf } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { mount, type SignedIn } from '../route-context';
import { atMost, safeOnDisk } from '../safe-on-disk';
import { resumeSubject, skipSubject, startSubject } from '../reviews';
import { loadRun, tellStored } from '../run-view';
import type { Services } from '../services';

const longestWaitMs = 20_000;

/** The driver of a run; for one that is over, or that nobody drives, the reason why nothing can be done with it. */
async function driverOf(services: Services, labId: string, runId: string): Promise<RunDriver> {
  const atOnce = services.activeRuns.find(labId, runId);
  if (atOnce !== null) return atOnce.driver;
  const run = await loadRun(services, labId, runId);
  if (run.rehearsal) throw new ProblemError('not-possible-now', 'A rehearsal runs by itself in fast time; nobody can step in.');
  if (['finished', 'stopped', 'failed'].includes(run.state))
    throw new ProblemError(
      'not-possible-now',
      `The run is over: it ${run.state === 'failed' ? 'failed' : run.state === 'stopped' ? 'was stopped' : 'has finished'}.`,
    );
  // A server that has just started may still be taking up the runs it found.
  await atMost(longestWaitMs, services.takenUp, services.clock);
  const later = services.activeRuns.find(labId, runId);
  if (later !== null) return later.driver;
  const why =
    services.supervisor.quarantinedOf(run.rigId)?.why ??
    'No server drives this run at the moment, so nothing keeps the turntable moving: its motion lease lapses within 2 s.';
  throw new ProblemError('not-possible-now', `${why} Use the switch at the rig if anything moves.`);
}

/** The controller has it already; the answer waits until it is safe on a disk, so that nothing that was answered can be forgotten. */
async function accepted({ clock }: Services, runId: string, answer: Answer): Promise<{ runId: string; serverAt: string }> {
  if (!answer.ok) throw new ProblemError('not-possible-now', answer.why);
  if (answer.kept !== undefined) await safeOnDisk(answer.kept, clock);
  return { runId, serverAt: isoOf(answer.serverAtUtcMs) };
}

const startReviewRoutes = [
  mount(reviewContracts.reviewStart, async ({ params, body, me, membership, services }) => {
    const { db } = services.database;
    const rig = await findRig(db, membership.labId, params.rigId);
    if (rig === null) throw notFound('rig');
    if ((await findRevision(db, { labId: membership.labId, protocolId: body.protocolId }, body.revision)) === null)
      throw notFound('protocol revision');
    if ((await findMassSet(db, { labId: membership.labId, rigId: rig.id }, body.massSetId)) === null) throw notFound('mass set');
    // Keeps the order that was looked at for as long as the token counts.
    services.startSeeds.of(rig.id);
    const { token, expiresUtcMs } = services.reviews.issue({ userId: me.userId, rigId: rig.id, subject: startSubject(body) });
    return { token, expiresAt: isoOf(expiresUtcMs), serverAt: isoOf(services.clock.utcMs()) };
  }),
];

const reviewRoutes = [
  mount(reviewContracts.reviewResume, async ({ params, me, membership, services }) => {
    const driver = await driverOf(services, membership.labId, params.runId);
    const found = services.activeRuns.find(membership.labId, params.runId);
    const plan = found === null ? null : resumePlan(found.run.start, driver.state(), services.clock.utcMs());
    if (found === null || plan === null) throw new ProblemError('not-possible-now', 'The run is not held, so there is nothing to resume.');
    const { rigId, start } = found.run;
    const { token, expiresUtcMs } = services.reviews.issue({ userId: me.userId, rigId, subject: resumeSubject(params.runId) });
    return { token, expiresAt: isoOf(expiresUtcMs), serverAt: isoOf(services.clock.utcMs()), ...remainingOf(plan, start.rig) };
  }),

  mount(reviewContracts.reviewSkip, async ({ params, body, me, membership, services }) => {
    const driver = await driverOf(services, membership.labId, params.runId);
    const found = services.activeRuns.find(membership.labId, params.runId);
    const plan = found === null ? null : skipPlan(found.run.start, driver.state(), services.clock.utcMs());
    if (found === null || plan === null)
      throw new ProblemError('not-possible-now', 'No dwell, settle or wait is under way, so there is nothing to leave out.');
    if (plan.seq !== body.seq)
      throw new ProblemError('not-possible-now', 'The step that was to be left out is over. Look at the run again.');
    const { rigId, start } = found.run;
    const { seq, path, kind, label, station, leftS, notGoodPath } = plan;
    const { token, expiresUtcMs } = services.reviews.issue({ userId: me.userId, rigId, subject: skipSubject(params.runId, seq) });
    const leavesOut = { seq, path, kind, label, station, leftS, notGoodPath };
    return {
      token,
      expiresAt: isoOf(expiresUtcMs),
      serverAt: isoOf(services.clock.utcMs()),
      ...remainingOf(plan, start.rig),
      ...leavesOut,
    };
  }),
];

const remainingOf = ({ dwellsLeft, finishUtcMs, next, firstMotion, turnsBack, relativeU }: RemainingPlan, rig: RigDocument) => ({
  dwellsLeft,
  next,
  finishAt: isoOf(finishUtcMs),
  firstMove: firstMotion === null ? 'nothing moves' : turnsBack ? 'rotate: turn back to where it began' : moveWords(firstMotion, rig),
  plannedU: relativeU,
});

function moveWords(step: LeafStep, { stations }: RigDocument): string {
  if (step.kind === 'kick') return 'kick: there and back again';
  if (step.kind === 'rotate') return `rotate: ${turnsWords(step)}, then back again`;
  if (step.kind !== 'swing') return 'home: find the edge of the home flag';
  if (typeof step.to !== 'string') return `swing to ${formatDegrees(step.to.angle_deg)}`;
  const station = stations[step.to];
  return station === undefined ? `swing to ${step.to}` : `swing to ${step.to} (${formatDegrees(station.value)})`;
}

/** Of a request and its repeats, whoever keeps answers: a run remembers it across processes. */
const keyOf = ({ me, key }: { me: SignedIn; key: string | null }): string | null => (key === null ? null : `${me.userId} ${key}`);

const haltRoutes = [
  mount(contracts.holdRun, async (context) => {
    const { params, me, membership, services } = context;
    const answer = (await driverOf(services, membership.labId, params.runId)).hold(me.name, keyOf(context));
    auditLater(context, 'run.hold-asked', { runId: params.runId });
    return accepted(services, params.runId, answer);
  }),

  mount(contracts.holdAfterDwell, async (context) => {
    const { params, me, membership, services } = context;
    const answer = (await driverOf(services, membership.labId, params.runId)).holdAfterDwell(me.name, keyOf(context));
    auditLater(context, 'run.hold-after-dwell-asked', { runId: params.runId });
    return accepted(services, params.runId, answer);
  }),

  mount(contracts.finishEarly, async (context) => {
    const { params, me, membership, services } = context;
    const answer = await (await driverOf(services, membership.labId, params.runId)).requests.finishEarly(me.name);
    if (answer.ok) auditLater(context, 'run.finish-asked', { runId: params.runId });
    return accepted(services, params.runId, answer);
  }),

  mount(contracts.stopRun, async (context) => {
    const { params, me, membership, services } = context;
    const found = services.activeRuns.find(membership.labId, params.runId);
    if (found === null) {
      const run = await loadRun(services, membership.labId, params.runId);
      if (run.state === 'stopped') return { runId: run.id, serverAt: isoOf(services.clock.utcMs()) };
      if (services.supervisor.quarantinedOf(run.rigId)?.start.runId === run.id) return endQuarantined(context, run);
    }
    const answer = (await driverOf(services, membership.labId, params.runId)).stop(me.name, keyOf(context));
    auditLater(context, 'run.stop-asked', { runId: params.runId });
    return accepted(services, params.runId, answer);
  }),
];

const actRoutes = [
  mount(goingOn.withdrawHold, async (context) => {
    const { params, body, me, membership, services } = context;
    const driver = await driverOf(services, membership.labId, params.runId);
    assertFreshTap(body.tappedAt, services.clock.utcMs(), 'withdraw the hold');
    const answer = await driver.requests.withdrawHold(me.name);
    if (answer.ok) auditLater(context, 'run.hold-withdrawn', { runId: params.runId });
    return accepted(services, params.runId, answer);
  }),

  mount(goingOn.withdrawFinish, async (context) => {
    const { params, body, me, membership, services } = context;
    const driver = await driverOf(services, membership.labId, params.runId);
    assertFreshTap(body.tappedAt, services.clock.utcMs(), 'take back the end');
    const answer = await driver.requests.withdrawFinish(me.name);
    if (answer.ok) auditLater(context, 'run.finish-withdrawn', { runId: params.runId });
    return accepted(services, params.runId, answer);
  }),

  mount(goingOn.resumeRun, async (context) => {
    const { params, body, me, membership, services } = context;
    const driver = await driverOf(services, membership.labId, params.runId);
    // After the waiting for a server that has just begun: what grew old meanwhile moves nothing.
    assertFreshTap(body.tappedAt, services.clock.utcMs(), 'resume');
    const rigId = rigOf(context, params.runId);
    services.reviews.take(body.reviewToken, { userId: me.userId, rigId, subject: resumeSubject(params.runId) });
    const answer = await driver.resume(me.name);
    assertNothingInTheWay(services, { driver, rigId, answer });
    auditLater(context, 'run.resumed', { runId: params.runId });
    return accepted(services, params.runId, answer);
  }),

  mount(goingOn.skipStep, async (context) => {
    const { params, body, me, membership, services } = context;
    const driver = await driverOf(services, membership.labId, params.runId);
    assertFreshTap(body.tappedAt, services.clock.utcMs(), 'skip');
    const rigId = rigOf(context, params.runId);
    services.reviews.take(body.reviewToken, { userId: me.userId, rigId, subject: skipSubject(params.runId, body.seq) });
    const answer = await driver.requests.skip(me.name, body.seq);
    assertNothingInTheWay(services, { driver, rigId, answer });
    auditLater(context, 'run.step-skipped', { runId: params.runId, seq: body.seq });
    return accepted(services, params.runId, answer);
  }),

  mount(goingOn.confirmPrompt, async (context) => {
    const { params, body, me, membership, services } = context;
    const driver = await driverOf(services, membership.labId, params.runId);
    assertFreshTap(body.tappedAt, services.clock.utcMs(), 'confirm');
    const answer = await driver.requests.confirmPrompt(me.name);
    assertNothingInTheWay(services, { driver, rigId: rigOf(context, params.runId), answer });
    auditLater(context, 'run.prompt-confirmed', { runId: params.runId });
    return accepted(services, params.runId, answer);
  }),
];

const rigOf = ({ services, membership }: Caller, runId: string): string =>
  services.activeRuns.find(membership.labId, runId)?.run.rigId ?? '';

/** A refusal of what moves masses, by what stands in its way. */
function assertNothingInTheWay(services: Services, { driver, rigId, answer }: { driver: RunDriver; rigId: string; answer: Answer }): void {
  if (answer.ok) return;
  const locked = services.locks.lockedBy(rigId) !== null;
  const disarmed = !driver.isOver() && services.arms.armOf(rigId) === null;
  throw new ProblemError(locked ? 'locked' : disarmed ? 'not-armed' : 'not-possible-now', answer.why);
}

/** Ends a run that this version cannot drive: nothing moves, and the rig is free again. Where its log does not take the end, its row alone says it. */
async function endQuarantined(caller: Caller, run: store.RunRecord): Promise<{ runId: string; serverAt: string }> {
  const { services, me } = caller;
  const nowUtcMs = services.clock.utcMs();
  const { supervisor, log } = services;
  const why = supervisor.quarantinedOf(run.rigId)?.why ?? '';
  try {
    await supervisor.giveUp(run.rigId, me.name);
  } catch (error) {
    if (error instanceof StaleRunError)
      throw new ProblemError('not-possible-now', 'Another server has written into this run meanwhile. Look at the run again.');
    if (isPassing(error)) throw error;
    log.error({ err: error, runId: run.id }, 'the log of a run did not take its end');
    await store.markRunFailed(services.database.db, run, { why: `${why} Ended by ${me.name}.`, nowUtcMs });
    supervisor.release(run.rigId);
  }
  tellStored(services, run);
  auditLater(caller, 'run.stop-asked', { runId: run.id });
  return { runId: run.id, serverAt: isoOf(nowUtcMs) };
}

export const interventionRoutes = [
  ...atTheRig(rigOfAddress, startReviewRoutes),
  ...atTheRig(rigOfItsRun, [...reviewRoutes, ...actRoutes]),
  ...atTheRig(rigOfItsRun, haltRoutes, { urgent: true }),
];
