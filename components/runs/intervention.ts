import type { RunState, RunView } from '@/shared/contracts/runs';

/** Hold, hold after this dwell and stop as the person sees them: sent, the server has it, the controller confirmed. Pure. */

export type SafeAct = 'hold' | 'hold-after-dwell' | 'stop';

export type LocalIntervention =
  | { kind: 'idle' }
  | { kind: 'sending'; act: SafeAct; tappedAtMs: number; attempts: number; unreachable: boolean }
  | { kind: 'accepted'; act: SafeAct; serverAtMs: number }
  | { kind: 'refused'; act: SafeAct; detail: string }
  | { kind: 'unanswered'; act: SafeAct; tappedAtMs: number; attempts: number };

export type InterventionAction =
  | { kind: 'tapped'; act: SafeAct; atMs: number }
  | { kind: 'attempt' }
  | { kind: 'no-answer' }
  | { kind: 'accepted'; serverAtMs: number }
  | { kind: 'refused'; detail: string }
  | { kind: 'gave-up' };

export function interventionReducer(state: LocalIntervention, action: InterventionAction): LocalIntervention {
  if (action.kind === 'tapped') return { kind: 'sending', act: action.act, tappedAtMs: action.atMs, attempts: 0, unreachable: false };
  if (state.kind !== 'sending') return state;
  switch (action.kind) {
    case 'attempt':
      return { ...state, attempts: state.attempts + 1 };
    case 'no-answer':
      return { ...state, unreachable: true };
    case 'accepted':
      return { kind: 'accepted', act: state.act, serverAtMs: action.serverAtMs };
    case 'refused':
      return { kind: 'refused', act: state.act, detail: action.detail };
    case 'gave-up':
      return { kind: 'unanswered', act: state.act, tappedAtMs: state.tappedAtMs, attempts: state.attempts };
  }
}

export type StageState = 'waiting' | 'now' | 'done' | 'failed';

export interface Stages {
  act: SafeAct;
  /** Somebody else's name when the act is not from this page. */
  by: string | null;
  sent: StageState;
  server: { state: StageState; atMs: number | null };
  controller: { state: StageState; atMs: number | null };
  /** What to know or to do beyond the three stages; empty while all is well. */
  sentence: string;
}

const useTheSwitch = 'The server cannot be reached. If it must stop now, use the switch at the rig.';
const words: Record<SafeAct, string> = { hold: 'Hold', 'hold-after-dwell': 'Hold after this dwell', stop: 'Stop' };

/** An act that the server knows of, newest. */
type Known = NonNullable<RunView['intervention']>;

const isSafe = (kind: Known['kind']): kind is SafeAct => kind === 'hold' || kind === 'hold-after-dwell' || kind === 'stop';

/**
 * The three stages from what this page did and what the server says. `Stopped` and `held` are said only when the
 * controller confirmed; an answer of the server alone is not enough.
 */
export function stagesOf(local: LocalIntervention, known: Known | null, state: RunState): Stages | null {
  if (local.kind === 'idle') return known && isSafe(known.kind) && isFresh(known, state) ? fromServer(known.kind, known, known.by) : null;
  if (known && known.kind === local.act && isAnswerTo(local, known)) return fromServer(local.act, known, null);
  if (known && isOvertaken(local, known)) return stagesOf({ kind: 'idle' }, known, state);
  const pending = { act: local.act, by: null, controller: { state: 'waiting' as const, atMs: null } };
  switch (local.kind) {
    case 'sending':
      return {
        ...pending,
        sent: 'done',
        server: { state: 'now', atMs: null },
        sentence: local.unreachable ? `No answer yet, trying again (${local.attempts}). ${useTheSwitch}` : '',
      };
    case 'accepted':
      return {
        ...pending,
        sent: 'done',
        server: { state: 'done', atMs: local.serverAtMs },
        controller: { state: 'now', atMs: null },
        sentence: '',
      };
    case 'refused':
      return {
        ...pending,
        sent: 'done',
        server: { state: 'failed', atMs: null },
        sentence: `${words[local.act]} was refused: ${local.detail}`,
      };
    case 'unanswered':
      return {
        ...pending,
        sent: 'done',
        server: { state: 'failed', atMs: null },
        sentence: `No answer in 30 s after ${local.attempts} attempts; it is not known whether the rig got it. ${useTheSwitch} Tap again to try again.`,
      };
  }
}

function fromServer(act: SafeAct, known: Known, by: string | null): Stages {
  const confirmed = known.confirmedAt !== null;
  const waitsForDwell = act === 'hold-after-dwell' && !confirmed;
  return {
    act,
    by,
    sent: 'done',
    server: { state: 'done', atMs: Date.parse(known.serverAt) },
    controller: { state: confirmed ? 'done' : 'now', atMs: confirmed ? Date.parse(known.confirmedAt as string) : null },
    sentence: waitsForDwell ? 'The run goes on until this dwell has ended.' : '',
  };
}

/** A hold that was resumed, or a stop long confirmed, is history; one under way or in force is not. */
function isFresh(known: Known, state: RunState): boolean {
  if (known.confirmedAt === null) return state !== 'finished' && state !== 'failed';
  return (
    (known.kind !== 'stop' && (state === 'held' || state === 'holding')) ||
    (known.kind === 'stop' && (state === 'stopping' || state === 'stopped'))
  );
}

/** The server's record answers this page's act when it is not older than the answer, or than the tap (2 s for unequal clocks). */
function isAnswerTo(local: Exclude<LocalIntervention, { kind: 'idle' }>, known: Known): boolean {
  const serverAtMs = Date.parse(known.serverAt);
  if (local.kind === 'accepted') return serverAtMs >= local.serverAtMs - 1;
  if (local.kind === 'sending' || local.kind === 'unanswered') return serverAtMs >= local.tappedAtMs - 2000;
  return false;
}

/** Somebody has acted since: what this page asked for is done with, a resumed hold above all. */
const isOvertaken = (local: LocalIntervention, known: Known): boolean =>
  local.kind === 'accepted' && Date.parse(known.serverAt) > local.serverAtMs;

/** What to say aloud at the newest stage. */
export function spokenStage(stages: Stages, clock: (utcMs: number) => string): string {
  const word = words[stages.act];
  const { controller, server } = stages;
  if (controller.state === 'done' && controller.atMs !== null)
    return `${stages.act === 'stop' ? 'Stopped' : 'Held'}: the controller confirmed at ${clock(controller.atMs)}.`;
  if (server.state === 'failed') return stages.sentence;
  if (server.state === 'done') return `${word}: the server has it, waiting for the controller. ${stages.sentence}`.trim();
  return `${word} sent. ${stages.sentence}`.trim();
}
