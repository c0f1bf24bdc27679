import type { RunStart } from '@/shared/archive/run-records';
import type { ProblemCode } from '@/shared/contracts/problem';
import { CODATA_2022_G } from '@/shared/physics/constants';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { checkProtocol } from '@/shared/protocol/check';
import { isShuffled } from '@/shared/protocol/shuffle';
import { StartRefused } from '../engine/rig-supervisor';
import type { Transaction } from '../store/database';
import { enqueueJob } from '../store/jobs';
import type { MassSetRecord, RigRecord } from '../store/rigs';
import { insertRun } from '../store/run-store';
import { activeRuns, findRun, markRunFailed, type RunRecord } from '../store/runs-read';
import { audited } from './audited';
import { ProblemError } from './problem-error';
import { refusalOf } from './refused-protocol';
import type { Membership, SignedIn } from './route-context';
import { rehearsalJobKind, type RehearsalJob } from './work/rehearsal-job';
import type { Services } from './services';
import { makeStartChecks, type StartReport } from './start-checks';
import { busyWords } from './start-checks-lab';
import { untilStored } from './until-stored';

export interface Caller {
  /** In whose name. */
  me: Pick<SignedIn, 'userId' | 'name'>;
  membership: Membership;
  services: Services;
}

/** Throws where a tap no longer counts. */
export type StillCounts = () => void;

export interface Begin {
  rig: RigRecord;
  protocolId: string;
  protocol: ProtocolDocument;
  /** 0 for the draft of a rehearsal. */
  revision: number;
  notes: string;
}

/** A start that was decided about beforehand. */
export interface Claim {
  runId: string;
  /** In the transaction that stores the run: whatever it throws, there is no run. */
  take(tx: Transaction): Promise<void>;
}

const longestTapMs = 5_000;

/** A command that sets masses in motion acts on a fresh tap only: a delayed one may come when somebody has walked in. */
export function assertFreshTap(tappedAt: string, nowUtcMs: number, act: string): void {
  const ageMs = nowUtcMs - Date.parse(tappedAt);
  if (Math.abs(ageMs) <= longestTapMs) return;
  const words = ageMs > 0 ? `was made ${String(Math.round(ageMs / 1000))} s ago` : "lies in the future by the server's clock";
  throw new ProblemError(
    'not-possible-now',
    `The tap to ${act} ${words}; it counts for 5 s. Nothing was moved. Look at the rig again, then ${act} once more.`,
  );
}

function runStartOf(
  { me, membership, services }: Caller,
  begin: Begin,
  seed: number,
): Omit<RunStart, 'rig' | 'massSetLabel' | 'arm' | 'simulated'> {
  return {
    labId: membership.labId,
    runId: services.newId(),
    rigId: begin.rig.id,
    rigName: begin.rig.name,
    rigRevision: begin.rig.revision,
    protocolName: begin.protocol.name,
    protocolRevision: begin.revision,
    protocol: begin.protocol,
    timeZone: membership.timeZone,
    operator: me.name,
    notes: begin.notes,
    ...(isShuffled(begin.protocol) ? { shuffleSeed: seed } : {}),
  };
}

/** Checks whose refusal has a code of its own. */
const codes: Readonly<Record<string, ProblemCode>> = { free: 'rig-busy', lock: 'locked', armed: 'not-armed', cautions: 'not-signed' };

function refusalOfChecks({ checks }: StartReport): ProblemError | null {
  const failed = checks.filter(({ state }) => state === 'fail');
  const [first] = failed;
  if (first === undefined) return null;
  const leading = ['free', 'lock'].map((of) => failed.find(({ code }) => code === of)).find((check) => check !== undefined) ?? first;
  const code = codes[leading.code] ?? 'not-ready';
  const more = failed.length > 1 ? ` ${String(failed.length - 1)} more stand against a start.` : '';
  return new ProblemError(
    code,
    `${leading.title}: ${leading.detail}${more}`,
    failed.map((check) => ({ path: check.code, message: `${check.title}: ${check.detail}`, code: check.code })),
  );
}

/** Starts a run: checks, the row in the database, then the engine. */
export async function beginRun(
  caller: Caller,
  begin: Begin & { massSet: MassSetRecord; claim?: Claim; stillCounts?: StillCounts },
): Promise<RunRecord> {
  const { services } = caller;
  const document = { ...begin.rig.document, sources: begin.massSet.sources };
  const refusal = refusalOf(checkProtocol(begin.protocol, document));
  if (refusal !== null) throw refusal;
  const report = await makeStartChecks(services, {
    rig: begin.rig,
    document,
    protocol: begin.protocol,
    timeZone: caller.membership.timeZone,
    userId: caller.me.userId,
  });
  const stands = refusalOfChecks(report);
  if (stands !== null) throw stands;
  const arm = services.arms.armOf(begin.rig.id);
  const start: RunStart = {
    ...runStartOf(caller, begin, report.shuffleSeed),
    ...(begin.claim === undefined ? {} : { runId: begin.claim.runId }),
    rig: document,
    massSetLabel: begin.massSet.label,
    simulated: null,
    arm: arm === null ? null : { name: arm.name, untilUtcMs: arm.untilUtcMs },
  };
  try {
    services.supervisor.assertMayStart(start);
    const run = await storeStart(caller, start, {
      begin,
      massSetId: begin.massSet.id,
      finishUtcMs: report.finishUtcMs,
      claim: begin.claim,
      stillCounts: begin.stillCounts,
    });
    assertStillCounts(services, start, begin.stillCounts);
    services.startSeeds.used(run.rigId);
    drive(services, run);
    return run;
  } catch (error) {
    if (!(error instanceof StartRefused)) {
      if (!(error instanceof ProblemError)) endUnbegun(services, start);
      throw error;
    }
    throw new ProblemError(
      error.code,
      error.message,
      error.findings.map((finding) => ({ path: finding.path ?? '', message: finding.message, code: finding.code })),
    );
  }
}

async function storeStart(
  caller: Caller,
  start: RunStart,
  with_: { begin: Begin; massSetId: string; finishUtcMs: number; claim: Claim | undefined; stillCounts: StillCounts | undefined },
): Promise<RunRecord> {
  const { services } = caller;
  const { db } = services.database;
  const entry = {
    kind: 'run.started',
    data: () => ({
      runId: start.runId,
      rigId: start.rigId,
      protocolId: with_.begin.protocolId,
      revision: start.protocolRevision,
      arm: start.arm,
    }),
  };
  await audited(caller, entry, async (tx) => {
    const row = {
      start,
      protocolId: with_.begin.protocolId,
      massSetId: with_.massSetId,
      startedById: caller.me.userId,
      state: 'starting' as const,
      nowUtcMs: services.clock.utcMs(),
      predictedEndUtcMs: with_.finishUtcMs,
    };
    await with_.claim?.take(tx);
    if (await insertRun(tx, row)) return with_.stillCounts?.();
    const other = (await activeRuns(db, start.labId)).get(start.rigId);
    throw new ProblemError(
      'rig-busy',
      other === undefined ? `${start.rigName} was taken by another run this very moment.` : busyWords(other),
    );
  });
  const run = await findRun(db, start.labId, start.runId);
  if (run === null) throw new Error('the new run was not found');
  return run;
}

/** What took so long to be stored that the tap no longer counts moves nothing any more. */
function assertStillCounts(services: Services, start: RunStart, stillCounts: StillCounts | undefined): void {
  try {
    stillCounts?.();
  } catch (error) {
    endUnbegun(
      services,
      start,
      'It took so long to store the run that the tap to start no longer counted, so it was not begun. Nothing was moved.',
    );
    throw error;
  }
}

const awayWords = 'The database went away while the run was started, so it was not begun. Nothing was moved.';

/** Where the answer of the database was lost the run may be there all the same, which nothing drives: it must not keep its rig. */
function endUnbegun(services: Services, { labId, runId }: RunStart, why = awayWords): void {
  const end = () => markRunFailed(services.database.db, { labId, id: runId }, { why, nowUtcMs: services.clock.utcMs() });
  if (services.supervisor.driverOf(runId) === null) untilStored(services, end, 'the end of a run that was not begun');
}

function drive(services: Services, run: RunRecord): void {
  services.activeRuns.add(run);
  services.stations.loadMasses(run.rigId, run.start.rig);
  try {
    services.supervisor.startRun(run.start);
  } catch (error) {
    services.activeRuns.remove(run.id);
    const why = error instanceof Error ? error.message : String(error);
    markRunFailed(services.database.db, run, { why, nowUtcMs: services.clock.utcMs() }).catch((failure: unknown) =>
      services.log.error({ err: failure, runId: run.id }, 'a run that did not start could not be marked'),
    );
    throw error;
  }
  services.access
    .refresh(services.watchedLabs())
    .catch((error: unknown) => services.log.warn({ err: error }, 'sessions could not be copied into memory'));
}

const rehearsalRateHz = 10;

/** Queues a rehearsal: a run on the simulated rig in fast time, which takes nobody's rig. */
export async function beginRehearsal(caller: Caller, begin: Begin & { seed: number }): Promise<RunRecord> {
  const { services, membership } = caller;
  const nowUtcMs = services.clock.utcMs();
  const homed = { angleDeg: begin.rig.document.motion?.homeDeg ?? 0, utcMs: nowUtcMs, timeZone: membership.timeZone };
  const refusal = refusalOf(checkProtocol(begin.protocol, begin.rig.document, homed));
  if (refusal !== null) throw refusal;
  const start: RunStart = {
    ...runStartOf(caller, begin, begin.seed),
    rig: begin.rig.document,
    massSetLabel: 'As in the rig document',
    arm: null,
    simulated: { trueG: CODATA_2022_G.value, seed: begin.seed, rateHz: rehearsalRateHz, faults: [] },
  };
  const rehearsed = { runId: start.runId, protocolId: begin.protocolId, revision: begin.revision, seed: begin.seed };
  await audited(caller, { kind: 'run.rehearsed', data: () => rehearsed }, async (tx) => {
    const row = { start, protocolId: begin.protocolId, massSetId: null, startedById: caller.me.userId, nowUtcMs, predictedEndUtcMs: null };
    await insertRun(tx, { ...row, state: 'rehearsing' });
    const payload: RehearsalJob = { labId: membership.labId, runId: start.runId };
    await enqueueJob(tx, { kind: rehearsalJobKind, payload, labId: membership.labId, nowUtcMs, maxAttempts: 2 });
  });
  services.pokeJobs();
  const run = await findRun(services.database.db, membership.labId, start.runId);
  if (run === null) throw new Error('the new rehearsal was not found');
  return run;
}
