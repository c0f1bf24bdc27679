import { useReducer, useRef } from 'react';
import { ApiProblem, call, newIdempotencyKey, serverNowIso, serverNowMs } from '@/components/api';
import { holdAfterDwell, holdRun, stopRun } from '@/shared/contracts/runs';
import { interventionReducer, type LocalIntervention, type SafeAct } from './intervention';
import { sendUntilAnswered, type Attempt, type Sending } from './send-until-answered';

interface RunAddress {
  labId: string;
  runId: string;
}

const routes = { hold: holdRun, 'hold-after-dwell': holdAfterDwell, stop: stopRun } as const;
/** Answers that say nothing about this act: the server is overloaded, at work on an earlier attempt, or its database is away. */
const inconclusive: ReadonlySet<string> = new Set(['still-running', 'database-away', 'rigs-away', 'too-many-requests', 'internal']);

type Outcome = { kind: 'accepted'; serverAtMs: number } | { kind: 'refused'; detail: string };

interface Tap {
  act: SafeAct;
  key: string;
  tappedAt: string;
}

/** Sends one attempt at a safe act to the server. */
export type SafePost = (
  act: SafeAct,
  input: { body: { tappedAt: string }; idempotencyKey: string; keepalive: true; signal: AbortSignal },
) => Promise<{ data: { serverAt: string } }>;

async function sendOnce(post: SafePost, { act, key, tappedAt }: Tap, signal: AbortSignal): Promise<Attempt<Outcome>> {
  try {
    const { data } = await post(act, { body: { tappedAt }, idempotencyKey: key, keepalive: true, signal });
    return { kind: 'answer', value: { kind: 'accepted', serverAtMs: Date.parse(data.serverAt) } };
  } catch (error) {
    if (error instanceof ApiProblem && !inconclusive.has(error.code))
      return { kind: 'answer', value: { kind: 'refused', detail: error.detail } };
    return { kind: 'none' };
  }
}

export interface SafeActs {
  local: LocalIntervention;
  tap: (act: SafeAct) => void;
}

/**
 * Hold, hold after this dwell and stop: one tap, sent until answered, acted on at most once. Leaving the screen does not
 * take it back: what was tapped goes on being sent.
 */
export function useSafeActs(post: SafePost): SafeActs {
  const [local, dispatch] = useReducer(interventionReducer, { kind: 'idle' });
  const running = useRef<{ act: SafeAct; sending: Sending<Outcome> } | null>(null);
  const tap = (act: SafeAct) => {
    if (running.current?.act === act) {
      running.current.sending.again();
      return;
    }
    if (running.current?.act === 'stop') return;
    running.current?.sending.cancel();
    const request = { act, key: newIdempotencyKey(), tappedAt: serverNowIso() };
    dispatch({ kind: 'tapped', act, atMs: serverNowMs() });
    const sending = sendUntilAnswered<Outcome>({
      send: (signal) => sendOnce(post, request, signal),
      onAttempt: () => dispatch({ kind: 'attempt' }),
      onNoAnswer: () => dispatch({ kind: 'no-answer' }),
    });
    running.current = { act, sending };
    void sending.answer.then((outcome) => {
      if (running.current?.sending !== sending) return;
      running.current = null;
      dispatch(outcome ?? { kind: 'gave-up' });
    });
  };
  return { local, tap };
}

/** The safe acts of a run. */
export const useIntervention = ({ labId, runId }: RunAddress): SafeActs =>
  useSafeActs((act, input) => call(routes[act], { params: { labId, runId }, ...input }));
