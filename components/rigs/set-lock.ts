import { useReducer, useState } from 'react';
import { call, deviceNowMs, newIdempotencyKey, useLab } from '@/components/api';
import { attemptOf } from '@/components/runs/safe-acts';
import { sendUntilAnswered, type Sending } from '@/components/runs/send-until-answered';
import { setLock, type LockView } from '@/shared/contracts/standing';

/** One's own personal lock on its way: sent until the server answers, for 30 s. Setting it is the safe direction, so it may be sent again. */

export type LockOnItsWay =
  | { kind: 'idle' }
  | { kind: 'sending'; attempts: number; unreachable: boolean }
  /** `answeredAtMs`: by the clock of this device. */
  | { kind: 'set'; lock: LockView; answeredAtMs: number }
  | { kind: 'refused'; detail: string }
  | { kind: 'unanswered'; attempts: number };

type Outcome = Extract<LockOnItsWay, { kind: 'set' | 'refused' }>;
type Action = { kind: 'tapped' | 'attempt' | 'no-answer' | 'gave-up' } | { kind: 'answered'; outcome: Outcome };

export function lockReducer(state: LockOnItsWay, action: Action): LockOnItsWay {
  if (action.kind === 'tapped') return { kind: 'sending', attempts: 0, unreachable: false };
  if (state.kind !== 'sending') return state;
  switch (action.kind) {
    case 'attempt':
      return { ...state, attempts: state.attempts + 1 };
    case 'no-answer':
      return { ...state, unreachable: true };
    case 'gave-up':
      return { kind: 'unanswered', attempts: state.attempts };
    case 'answered':
      return action.outcome;
  }
}

const useTheSwitch = 'Use the switch or the key at the rig.';

/** What to know and to do while the lock is not known to be set; empty while it is, or while the first answer is awaited. */
export function lockSentence(state: LockOnItsWay): string {
  switch (state.kind) {
    case 'sending':
      return state.unreachable ? `Not locked: no answer yet, trying again (${state.attempts}). ${useTheSwitch}` : '';
    case 'unanswered':
      return `Not locked: no answer in 30 s after ${state.attempts} attempts. ${useTheSwitch} Tap again to try again.`;
    case 'refused':
      return `Not locked: ${state.detail} ${useTheSwitch}`;
    default:
      return '';
  }
}

class LockSender {
  private running: Sending<Outcome> | null = null;

  constructor(private readonly tell: (action: Action) => void) {}

  tap(place: { labId: string; rigId: string }): void {
    if (this.running?.again() === true) return;
    const request = { params: place, body: {}, idempotencyKey: newIdempotencyKey(), keepalive: true as const };
    this.tell({ kind: 'tapped' });
    const sending = sendUntilAnswered<Outcome>({
      send: (signal) =>
        attemptOf<Outcome>(
          async () => ({ kind: 'set', lock: (await call(setLock, { ...request, signal })).data, answeredAtMs: deviceNowMs() }),
          (detail) => ({ kind: 'refused', detail }),
        ),
      onAttempt: () => this.tell({ kind: 'attempt' }),
      onNoAnswer: () => this.tell({ kind: 'no-answer' }),
    });
    this.running = sending;
    void sending.answer.then((outcome) => {
      this.running = null;
      this.tell(outcome === null ? { kind: 'gave-up' } : { kind: 'answered', outcome });
    });
  }
}

/** Leaving the screen does not take a lock back: what was tapped goes on being sent. */
export function useSetLock(rigId: string): { state: LockOnItsWay; tap: () => void } {
  const { labId } = useLab();
  const [state, dispatch] = useReducer(lockReducer, { kind: 'idle' });
  const [sender] = useState(() => new LockSender(dispatch));
  return { state, tap: () => sender.tap({ labId, rigId }) };
}
