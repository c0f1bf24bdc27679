import { KeyTurns } from '@/server/engine/key-turns';
import type { LinkEvent } from '@/server/interfaces/turntable-link';

/** What a turn of the arm key proves: that somebody stood at the rig after an instant, a short while ago, once. */

const setUtcMs = 1_000_000;
let nowMs = 0;
let turns: KeyTurns;
beforeEach(() => {
  nowMs = 50_000;
  turns = new KeyTurns({ monotonicMs: () => nowMs });
});

const at = (utcMs: number) => ({ utcMs, uS: 0.001 }) as LinkEvent['at'];
const turn = (utcMs: number) => turns.heard('north', { kind: 'arm-key', at: at(utcMs), on: true });
const counts = () => turns.take('north', setUtcMs) !== null;

test('a turn counts once, for 2 min, and for its own rig', () => {
  turn(setUtcMs + 1);
  expect(turns.take('south', setUtcMs)).toBeNull();
  expect(counts()).toBe(true);
  expect(counts()).toBe(false);
  turn(setUtcMs + 2);
  nowMs += 120_000;
  expect(counts()).toBe(true);
  turn(setUtcMs + 3);
  nowMs += 120_001;
  expect(counts()).toBe(false);
});

test('a turn from before the lock was set shows nothing: that hand is in the rig now', () => {
  turn(setUtcMs - 1);
  expect(counts()).toBe(false);
});

test('a controller that restarted and a line that was lost have shown nobody', () => {
  turn(setUtcMs + 1);
  turns.heard('north', { kind: 'reset', at: at(setUtcMs + 2), bootId: '2' });
  expect(counts()).toBe(false);
  turn(setUtcMs + 3);
  turns.heard('north', { kind: 'lost', at: at(setUtcMs + 4), why: 'silent' });
  expect(counts()).toBe(false);
});

test('one that was taken for nothing is given back, unless a newer one has come', () => {
  turn(setUtcMs + 1);
  const taken = turns.take('north', setUtcMs);
  if (taken === null) throw new Error('the turn does not count');
  turns.giveBack('north', taken);
  expect(turns.take('north', setUtcMs)).toEqual(taken);
  turn(setUtcMs + 5);
  turns.giveBack('north', taken);
  expect(turns.take('north', setUtcMs)?.utcMs).toBe(setUtcMs + 5);
});
