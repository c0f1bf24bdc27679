import {
  advanceCommand,
  REPEAT_MS,
  type CommandEffect,
  type CommandInput,
  type CommandLife,
  type RequestClass,
} from '@/server/links/command-life';

/** The whole life of a request as a table: class and state, input, state after it, effects. */
const queued: CommandLife = { phase: 'queued' };
const sent: CommandLife = { phase: 'sent', attempts: 1, nextAtMs: 1_000 };
const uncertain: CommandLife = { phase: 'uncertain' };
const accepted: CommandLife = { phase: 'accepted' };
const moving: CommandLife = { phase: 'moving' };
const done: CommandLife = { phase: 'over', outcome: 'done' };
const over = (outcome: 'done' | 'refused' | 'unheard' | 'overtaken' | 'reset'): CommandLife => ({ phase: 'over', outcome });
const on = (kind: Exclude<CommandInput['kind'], 'send' | 'tick'>): CommandInput => ({ kind });
const send: CommandInput = { kind: 'send', nowMs: 700 };
const early: CommandInput = { kind: 'tick', nowMs: 999 };
const due: CommandInput = { kind: 'tick', nowMs: 1_000 };

type Row = [RequestClass, CommandLife, CommandInput, CommandLife, CommandEffect[]];

const table: Row[] = [
  // Sending and repeating.
  ['ask', queued, send, { phase: 'sent', attempts: 1, nextAtMs: 700 + REPEAT_MS.ask }, ['write']],
  ['motion', queued, send, { phase: 'sent', attempts: 1, nextAtMs: 700 + REPEAT_MS.motion }, ['write']],
  ['stop', queued, send, { phase: 'sent', attempts: 1, nextAtMs: 700 + REPEAT_MS.stop }, ['write']],
  ['motion', sent, send, sent, []],
  ['motion', sent, early, sent, []],
  ['motion', sent, due, { phase: 'sent', attempts: 2, nextAtMs: 1_000 + REPEAT_MS.motion }, ['write']],
  ['stop', sent, due, { phase: 'sent', attempts: 2, nextAtMs: 1_000 + REPEAT_MS.stop }, ['write']],
  ['ask', sent, due, over('unheard'), []],
  ['hello', sent, due, over('unheard'), []],
  ['motion', accepted, due, accepted, []],
  // Answers.
  ['ask', sent, on('ok'), over('done'), []],
  ['motion', sent, on('ok'), accepted, ['accepted']],
  ['motion', uncertain, on('ok'), accepted, ['accepted']],
  ['motion', accepted, on('ok'), accepted, []],
  ['stop', sent, on('ok'), accepted, ['accepted']],
  ['motion', sent, on('no'), over('refused'), ['refused']],
  ['motion', uncertain, on('no'), over('refused'), ['refused']],
  ['motion', moving, on('no'), moving, []],
  // A stop goes first.
  ['motion', queued, on('overtaken'), over('overtaken'), ['overtaken']],
  ['motion', sent, on('overtaken'), uncertain, []],
  ['motion', accepted, on('overtaken'), accepted, []],
  ['ask', sent, on('overtaken'), over('overtaken'), []],
  ['stop', sent, on('overtaken'), queued, []],
  // The line or the session breaks.
  ['motion', queued, on('cut-off'), over('unheard'), ['not-delivered']],
  ['motion', sent, on('cut-off'), uncertain, []],
  ['motion', moving, on('cut-off'), moving, []],
  ['stop', sent, on('cut-off'), queued, []],
  ['stop', accepted, on('cut-off'), accepted, []],
  ['ask', sent, on('cut-off'), over('unheard'), []],
  // What the events tell of an order whose answer is missing.
  ['motion', uncertain, on('caught-up'), over('unheard'), ['not-delivered']],
  ['motion', sent, on('caught-up'), sent, []],
  ['motion', uncertain, on('began'), moving, ['accepted', 'began']],
  ['motion', sent, on('began'), moving, ['accepted', 'began']],
  ['motion', accepted, on('began'), moving, ['began']],
  ['motion', moving, on('ended'), over('done'), ['ended']],
  ['motion', accepted, on('ended'), over('done'), ['ended']],
  ['motion', uncertain, on('ended'), over('done'), ['accepted', 'ended']],
  ['motion', queued, on('ended'), queued, []],
  ['stop', accepted, on('ended'), accepted, []],
  ['motion', done, on('began'), done, []],
  // Standstill ends a stop, and only one that is answered.
  ['stop', accepted, on('standstill'), over('done'), ['standstill']],
  ['stop', sent, on('standstill'), sent, []],
  ['motion', accepted, on('standstill'), accepted, []],
  // The controller restarts.
  ['motion', moving, on('reset'), over('reset'), ['reset']],
  ['motion', accepted, on('reset'), over('reset'), ['reset']],
  ['motion', uncertain, on('reset'), over('reset'), ['not-delivered']],
  ['motion', sent, on('reset'), over('reset'), ['not-delivered']],
  ['motion', queued, on('reset'), queued, []],
  ['stop', accepted, on('reset'), queued, []],
  ['stop', sent, on('reset'), queued, []],
  ['ask', sent, on('reset'), over('reset'), []],
];

const words = (life: CommandLife) => (life.phase === 'over' ? `over (${life.outcome})` : life.phase);

test.each(table.map((row) => [`${row[0]} ${words(row[1])}, ${row[2].kind} → ${words(row[3])}`, row] as const))(
  '%s',
  (_name, [of, life, input, after, effects]) => {
    expect(advanceCommand(life, of, input)).toEqual({ life: after, effects });
  },
);

test('a stop is repeated every 100 ms for as long as it is not answered', () => {
  let life = advanceCommand(queued, 'stop', { kind: 'send', nowMs: 0 }).life;
  let written = 1;
  for (let nowMs = 1; nowMs <= 10_000; nowMs += 1) {
    const step = advanceCommand(life, 'stop', { kind: 'tick', nowMs });
    life = step.life;
    written += step.effects.filter((effect) => effect === 'write').length;
  }
  expect(written).toBe(101);
});

test('what is over stays over, whatever comes', () => {
  const inputs: CommandInput[] = [
    send,
    due,
    ...(['ok', 'no', 'overtaken', 'cut-off', 'caught-up', 'began', 'ended', 'standstill', 'reset'] as const).map(on),
  ];
  for (const of of ['ask', 'hello', 'motion', 'stop'] as const) {
    for (const input of inputs) expect(advanceCommand(done, of, input)).toEqual({ life: done, effects: [] });
  }
});
