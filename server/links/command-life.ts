/**
 * The life of one request to the controller: sent, answered, repeated, overtaken, carried out. A pure function of
 * state and input; who writes bytes, reads clocks and tells others is somebody else.
 *
 * An `ask` (status, renewal, …) or a `hello` is worth nothing when late and is never repeated. A `motion` (home, move) is repeated
 * with the same number, which the controller carries out at most once (SPEC 3.6). A `stop` (hold, stop) is repeated
 * until it is answered, over any number of lines and sessions (SPEC 9.6).
 */
export type RequestClass = 'ask' | 'hello' | 'motion' | 'stop';

export type CommandLife =
  | { phase: 'queued' }
  | { phase: 'sent'; attempts: number; nextAtMs: number }
  /** Sent, then overtaken by a stop or cut off: the controller's events will tell whether it was accepted. */
  | { phase: 'uncertain' }
  /** Answered `ok`; its motion has not begun, or its standstill is not yet told. */
  | { phase: 'accepted' }
  | { phase: 'moving' }
  | { phase: 'over'; outcome: Outcome };

export type Outcome = 'done' | 'refused' | 'unheard' | 'overtaken' | 'reset';

export type CommandInput =
  | { kind: 'send'; nowMs: number }
  | { kind: 'tick'; nowMs: number }
  /** Answered `ok`, or `repeat`, which says that it was accepted before. */
  | { kind: 'ok' }
  | { kind: 'no' }
  /** A stop goes before it. */
  | { kind: 'overtaken' }
  /** The line or the session is gone. */
  | { kind: 'cut-off' }
  /** All events of the controller up to a later reply are read. */
  | { kind: 'caught-up' }
  | { kind: 'began' }
  | { kind: 'ended' }
  /** The controller told that the turntable stands still. */
  | { kind: 'standstill' }
  /** The controller restarted. */
  | { kind: 'reset' };

export type CommandEffect =
  | 'write'
  | 'accepted'
  | 'refused'
  /** It never reached the controller, and no longer can. */
  | 'not-delivered'
  | 'overtaken'
  | 'began'
  | 'ended'
  | 'standstill'
  /** Its motion ended with the controller's restart. */
  | 'reset';

/**
 * How long an answer is awaited, ms. A controller answers within 50 ms (SPEC 4.2), a busy machine may take longer, a
 * board that its port resets on opening about 1 s. Stops are repeated every 100 ms (SPEC 9.6).
 */
export const REPEAT_MS: Record<RequestClass, number> = { ask: 500, hello: 1000, motion: 300, stop: 100 };

export interface CommandStep {
  life: CommandLife;
  effects: CommandEffect[];
}

export function advanceCommand(life: CommandLife, of: RequestClass, input: CommandInput): CommandStep {
  switch (input.kind) {
    case 'send':
      return life.phase === 'queued' ? sent(of, 1, input.nowMs) : same(life);
    case 'tick':
      return tick(life, of, input.nowMs);
    case 'ok':
      return answered(life, of);
    case 'no':
      return isOpen(life) ? over('refused', ['refused']) : same(life);
    case 'overtaken':
      return overtaken(life, of);
    case 'cut-off':
      return cutOff(life, of);
    case 'caught-up':
      return life.phase === 'uncertain' ? over('unheard', ['not-delivered']) : same(life);
    case 'began':
      return of === 'motion' ? began(life) : same(life);
    case 'ended':
      return of === 'motion' ? ended(life) : same(life);
    case 'standstill':
      return of === 'stop' && life.phase === 'accepted' ? over('done', ['standstill']) : same(life);
    case 'reset':
      return reset(life, of);
  }
}

const same = (life: CommandLife): CommandStep => ({ life, effects: [] });
const over = (outcome: Outcome, effects: CommandEffect[]): CommandStep => ({ life: { phase: 'over', outcome }, effects });
const isQuestion = (of: RequestClass) => of === 'ask' || of === 'hello';
const isOpen = (life: CommandLife) => life.phase === 'sent' || life.phase === 'uncertain';

function sent(of: RequestClass, attempts: number, nowMs: number): CommandStep {
  return { life: { phase: 'sent', attempts, nextAtMs: nowMs + REPEAT_MS[of] }, effects: ['write'] };
}

function tick(life: CommandLife, of: RequestClass, nowMs: number): CommandStep {
  if (life.phase !== 'sent' || nowMs < life.nextAtMs) return same(life);
  return isQuestion(of) ? over('unheard', []) : sent(of, life.attempts + 1, nowMs);
}

function answered(life: CommandLife, of: RequestClass): CommandStep {
  if (!isOpen(life)) return same(life);
  return isQuestion(of) ? over('done', []) : { life: { phase: 'accepted' }, effects: ['accepted'] };
}

function overtaken(life: CommandLife, of: RequestClass): CommandStep {
  if (isQuestion(of)) return life.phase === 'sent' ? over('overtaken', []) : same(life);
  if (of === 'stop') return life.phase === 'sent' ? same({ phase: 'queued' }) : same(life);
  if (life.phase === 'queued') return over('overtaken', ['overtaken']);
  return life.phase === 'sent' ? same({ phase: 'uncertain' }) : same(life);
}

function cutOff(life: CommandLife, of: RequestClass): CommandStep {
  if (isQuestion(of)) return life.phase === 'sent' ? over('unheard', []) : same(life);
  if (of === 'stop') return life.phase === 'sent' ? same({ phase: 'queued' }) : same(life);
  if (life.phase === 'queued') return over('unheard', ['not-delivered']);
  return life.phase === 'sent' ? same({ phase: 'uncertain' }) : same(life);
}

function began(life: CommandLife): CommandStep {
  if (life.phase === 'over' || life.phase === 'queued') return same(life);
  return { life: { phase: 'moving' }, effects: isOpen(life) ? ['accepted', 'began'] : ['began'] };
}

function ended(life: CommandLife): CommandStep {
  if (life.phase === 'over' || life.phase === 'queued') return same(life);
  return over('done', isOpen(life) ? ['accepted', 'ended'] : ['ended']);
}

function reset(life: CommandLife, of: RequestClass): CommandStep {
  if (of === 'stop') return life.phase === 'over' ? same(life) : same({ phase: 'queued' });
  if (isQuestion(of)) return life.phase === 'over' ? same(life) : over('reset', []);
  if (life.phase === 'over' || life.phase === 'queued') return same(life);
  return over('reset', isOpen(life) ? ['not-delivered'] : ['reset']);
}
