import { call, newIdempotencyKey } from '@/components/api/client';
import { serverNowIso, serverNowMs } from '@/components/api/device-clock';
import { ApiProblem } from '@/components/api/problem';
import { holdAfterDwell, holdRun, stopRun } from '@/shared/contracts/runs';
import type { InterventionAction, SafeAct } from './intervention';
import { sendUntilAnswered, type Attempt, type Sending } from './send-until-answered';

export interface RunAddress {
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

/** One attempt: what it was answered, a refusal included, or that this says nothing. */
export async function attemptOf<T>(send: () => Promise<T>, refused: (detail: string) => T): Promise<Attempt<T>> {
  try {
    return { kind: 'answer', value: await send() };
  } catch (error) {
    if (error instanceof ApiProblem && !inconclusive.has(error.code)) return { kind: 'answer', value: refused(error.detail) };
    return { kind: 'none' };
  }
}

const sendOnce = (post: SafePost, { act, key, tappedAt }: Tap, signal: AbortSignal): Promise<Attempt<Outcome>> =>
  attemptOf<Outcome>(
    async () => {
      const { data } = await post(act, { body: { tappedAt }, idempotencyKey: key, keepalive: true, signal });
      return { kind: 'accepted', serverAtMs: Date.parse(data.serverAt) };
    },
    (detail) => ({ kind: 'refused', detail }),
  );

/** Sends safe acts of a run. */
export const postOfRun =
  ({ labId, runId }: RunAddress): SafePost =>
  (act, input) =>
    call(routes[act], { params: { labId, runId }, ...input });

/** Hold, hold after this dwell and stop: one tap, sent until answered, acted on at most once. `tell` hears what becomes of them. */
export class SafeActSender {
  private running: { act: SafeAct; sending: Sending<Outcome> } | null = null;

  constructor(private readonly tell: (action: InterventionAction) => void) {}

  tap(act: SafeAct, post: SafePost): void {
    if (this.running?.act === act && this.running.sending.again()) return;
    if (this.running?.act === 'stop' && act !== 'stop') return;
    this.running?.sending.cancel();
    const request = { act, key: newIdempotencyKey(), tappedAt: serverNowIso() };
    this.tell({ kind: 'tapped', act, atMs: serverNowMs() });
    const sending = sendUntilAnswered<Outcome>({
      send: (signal) => sendOnce(post, request, signal),
      onAttempt: () => this.tell({ kind: 'attempt' }),
      onNoAnswer: () => this.tell({ kind: 'no-answer' }),
    });
    this.running = { act, sending };
    void sending.answer.then((outcome) => {
      if (this.running?.sending !== sending) return;
      this.running = null;
      this.tell(outcome ?? { kind: 'gave-up' });
    });
  }
}
