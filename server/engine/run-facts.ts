import type { RunStart, StepRow } from '@/shared/archive/run-records';
import type { DwellFacts } from '@/shared/conditions/dwell-verdict';
import { reversalSoFar, type ReversalSoFar } from '@/shared/conditions/relative-u';
import type { RunState } from '@/shared/contracts/runs';
import { planTimeline } from '@/shared/protocol/timeline';
import type { RunSummaryColumns } from '../interfaces/run-store';
import { confirmRefusal } from './awaiting';
import { Draft, nothingOut } from './draft';
import { lastAreGood } from './dwells';
import { resumeRefusal } from './halting';
import { predictEndUtcMs } from './predicted-end';
import type { Arm, ChartState, Finishing, InterventionKind, KnownPosition, RunSnapshot, Waiting } from './run-context';
import { skipRefusal } from './skipping';

/** What screens and lists show of a run, read off its snapshot. */
export interface RunFacts {
  runId: string;
  state: RunState;
  /** Why it is held, stopped or failed, and what would help; empty while all is well. */
  reason: string;
  /** Of the reason; empty while there is none. */
  reasonCode: string;
  startedAtUtcMs: number | null;
  endedAtUtcMs: number | null;
  predictedEndUtcMs: number | null;
  current: StepRow | null;
  /** When the present step ends by plan; null where it ends by an event. */
  deadlineUtcMs: number | null;
  dwellsDone: number;
  dwellsPlanned: number;
  /** The end of the plan as it stood at the start. */
  plannedEndUtcMs: number;
  holdAfterDwell: boolean;
  /** That it ends, or was to end, before the end of its protocol; null: nobody asked. */
  finishing: Finishing | null;
  dwellsGood: number;
  /** The last four that were judged are good; false where fewer were. */
  lastDwellsAreGood: boolean;
  /** Dwells that are done and not good for no other reason than that somebody skipped the other of their pair. */
  dwellsUnpaired: number;
  waiting: WaitingFacts | null;
  /** Near minus far so far; null before there is a reversal. */
  reversal: ReversalSoFar | null;
  /** That the dwell judged last was noisier than an ordinary night's; null where it was not. */
  loud: DwellFacts['loud'];
  /** What proves the counted angle; null where nothing was kept. */
  position: KnownPosition | null;
  intervention: { kind: InterventionKind; by: string; serverAtUtcMs: number; confirmedAtUtcMs: number | null } | null;
  mayResume: { ok: boolean; why: string };
  maySkip: { ok: boolean; why: string; seq: number | null };
  /** Last sequence number of the event chain. */
  lastSeq: number;
}

/** What the present step waits for. */
export interface WaitingFacts extends Waiting {
  kind: 'settle' | 'wait' | 'prompt';
  text: string;
  mayConfirm: { ok: boolean; why: string };
}

const shown: Record<ChartState, RunState> = {
  starting: 'starting',
  choosing: 'running',
  homing: 'running',
  moving: 'running',
  standing: 'running',
  awaiting: 'running',
  interrupted: 'holding',
  holding: 'holding',
  held: 'held',
  stopping: 'stopping',
  stopped: 'stopped',
  finished: 'finished',
  failed: 'failed',
};

/** An interrupted dwell goes on: nothing moves, and the run waits for the line only when its next motion is due. */
function runStateOf({ state, context }: RunSnapshot): RunState {
  return state === 'interrupted' && context.step?.motion === null ? 'running' : shown[state];
}

const outcomes: Partial<Record<ChartState, 'finished' | 'held' | 'stopped' | 'failed'>> = {
  finished: 'finished',
  held: 'held',
  stopped: 'stopped',
  failed: 'failed',
};

export function summaryOf(snapshot: RunSnapshot, predictedEndUtcMs: number | null): RunSummaryColumns {
  const { startedAtUtcMs, endedAtUtcMs } = snapshot.context;
  return { state: runStateOf(snapshot), outcome: outcomes[snapshot.state] ?? null, startedAtUtcMs, endedAtUtcMs, predictedEndUtcMs };
}

interface Now {
  utcMs: number;
  arm: Arm | null;
  /** In a sentence, whose personal locks are on the rig. */
  lockedBy: string | null;
  /** Predicted finish, UTC ms, where it is known: on a long protocol it takes as long to find as all the rest. */
  predictedEndUtcMs?: number | null;
}

/** Whether a person could resume now, and if not, what stands in the way. */
export function mayResume(start: RunStart, snapshot: RunSnapshot, now: Now): { ok: boolean; why: string } {
  if (snapshot.state === 'holding') return { ok: false, why: 'The run is still coming to rest.' };
  if (snapshot.state !== 'held') return { ok: false, why: 'The run is not held.' };
  if (now.lockedBy !== null) return { ok: false, why: now.lockedBy };
  const event = { type: 'resume' as const, at: { utcMs: now.utcMs, uS: 0 }, by: '', arm: now.arm };
  const why = resumeRefusal(new Draft(start, event, { context: snapshot.context, out: nothingOut }));
  return { ok: why === null, why: why ?? '' };
}

/** Whether a person could leave out the rest of the present step now, and if not, what stands in the way. */
export function maySkip(
  start: RunStart,
  snapshot: RunSnapshot,
  { seq, predictedEndUtcMs = null, ...now }: Now & { seq: number | null },
): { ok: boolean; why: string } {
  const { state, context } = snapshot;
  if (state !== 'standing' && state !== 'awaiting' && state !== 'held')
    return { ok: false, why: 'Only a dwell, a settle or a wait can be left out.' };
  if (now.lockedBy !== null) return { ok: false, why: now.lockedBy };
  const event = { type: 'skip' as const, at: { utcMs: now.utcMs, uS: 0 }, by: '', arm: now.arm, seq: seq ?? 0 };
  const why = skipRefusal(new Draft(start, event, { context, out: nothingOut, predictedEndUtcMs }));
  return { ok: why === null, why: why ?? '' };
}

export interface FactsInput {
  start: RunStart;
  snapshot: RunSnapshot;
  nowUtcMs: number;
  arm: Arm | null;
  lockedBy: string | null;
  lastSeq: number;
  predictedEndUtcMs: number | null;
  planned: PlannedRun;
}

export function factsOf({ start, snapshot, nowUtcMs, arm, lockedBy, lastSeq, predictedEndUtcMs, planned }: FactsInput): RunFacts {
  const { context } = snapshot;
  const open = context.step !== null && context.step.row.outcome === null ? context.step.row : null;
  const { intervention } = context;
  const seq = context.step?.row.seq ?? null;
  return {
    runId: start.runId,
    state: runStateOf(snapshot),
    reason: context.reason?.text ?? '',
    reasonCode: context.reason?.code ?? '',
    startedAtUtcMs: context.startedAtUtcMs,
    endedAtUtcMs: context.endedAtUtcMs,
    predictedEndUtcMs,
    current: open,
    deadlineUtcMs: open?.plannedEndUtcMs ?? null,
    dwellsDone: context.dwellsDone,
    dwellsPlanned: planned.dwells,
    plannedEndUtcMs: planned.endUtcMs,
    holdAfterDwell: context.holdAfterStep !== null,
    finishing: context.finishing ?? null,
    dwellsGood: context.dwellsGood,
    lastDwellsAreGood: lastAreGood(context.dwells),
    dwellsUnpaired: context.dwellsUnpaired ?? 0,
    waiting: waitingFacts(start, snapshot, { utcMs: nowUtcMs, arm, lockedBy }),
    reversal: reversalSoFar(context.dwells),
    loud: context.dwells.at(-1)?.loud ?? null,
    position: context.position,
    intervention:
      intervention === null
        ? null
        : {
            kind: intervention.kind,
            by: intervention.by,
            serverAtUtcMs: intervention.serverAtUtcMs,
            confirmedAtUtcMs: intervention.confirmedAtUtcMs,
          },
    mayResume: mayResume(start, snapshot, { utcMs: nowUtcMs, arm, lockedBy }),
    maySkip: { ...maySkip(start, snapshot, { utcMs: nowUtcMs, arm, lockedBy, seq, predictedEndUtcMs }), seq },
    lastSeq,
  };
}

function waitingFacts(start: RunStart, { state, context }: RunSnapshot, now: Now): WaitingFacts | null {
  const { waiting, step } = context;
  if (state !== 'awaiting' || waiting === null || step === null) return null;
  const planned = step.item.step;
  const kind = planned.kind === 'prompt' ? 'prompt' : planned.kind === 'settle' ? 'settle' : 'wait';
  const event = { type: 'confirm-prompt' as const, at: { utcMs: now.utcMs, uS: 0 }, by: '', arm: now.arm };
  const why = now.lockedBy ?? confirmRefusal(new Draft(start, event, { context, out: nothingOut }));
  return { ...waiting, kind, text: planned.kind === 'prompt' ? planned.text : '', mayConfirm: { ok: why === null, why: why ?? '' } };
}

/** What screens show while the database is away: the run itself cannot know yet for how long. */
export function withDatabase(facts: RunFacts, awaySinceUtcMs: number | null): RunFacts {
  if (awaySinceUtcMs === null) return facts;
  const since = new Date(awaySinceUtcMs).toISOString().slice(11, 19);
  const away = `The database is away since ${since} UTC; motion has been brought to rest, and the log is kept here until it is back.`;
  return { ...facts, reason: `${facts.reason} ${away}`.trim() };
}

export interface PlannedRun {
  dwells: number;
  endUtcMs: number;
}

/** The plan as it stood at the start. */
export function plannedRun(start: RunStart, fromUtcMs: number): PlannedRun {
  const { dwells, endUtcMs } = planTimeline(start, { utcMs: fromUtcMs, angleDeg: start.rig.motion?.homeDeg ?? 0 });
  return { dwells, endUtcMs };
}

/** Keeps the predicted finish and works it out anew only when the run is off what was predicted. */
export function createPredictor(start: RunStart): (snapshot: RunSnapshot, nowUtcMs: number) => number | null {
  let expected = new Map<string, number>();
  let endUtcMs: number | null = null;
  let finishBy: number | undefined;
  return (snapshot, nowUtcMs) => {
    const { context, state } = snapshot;
    if (context.startedAtUtcMs === null) return null;
    if (state === 'stopped' || state === 'failed' || state === 'held' || state === 'holding' || state === 'stopping') return null;
    if (context.endedAtUtcMs !== null) return context.endedAtUtcMs;
    const row = context.step?.row;
    const due = row === undefined ? undefined : expected.get(row.path);
    const changed = finishBy !== context.cursor.finishByUtcMs;
    finishBy = context.cursor.finishByUtcMs;
    if (!changed && endUtcMs !== null && row !== undefined && due !== undefined && Math.abs(row.startUtcMs - due) < 1000) return endUtcMs;
    expected = new Map();
    endUtcMs = predictEndUtcMs(start, context, { nowUtcMs, eachStep: ({ path }, startUtcMs) => expected.set(path, startUtcMs) });
    if (row !== undefined) expected.set(row.path, row.startUtcMs);
    return endUtcMs;
  };
}
