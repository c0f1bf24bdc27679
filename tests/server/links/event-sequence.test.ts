import type { EventMessage } from '@/firmware-protocol/codec';
import { EventSequence } from '@/server/links/event-sequence';

const event = (number: number): EventMessage => ({
  kind: 'event',
  number,
  atUs: number * 1000,
  what: { word: 'key', on: number % 2 === 0 },
});
const numbers = (events: EventMessage[]) => events.map((given) => given.number);

test('gives events on as they come, each once', () => {
  const sequence = new EventSequence();
  sequence.startAfter(4);
  sequence.skipTo(5);
  expect(numbers(sequence.add(event(5)))).toEqual([5]);
  expect(numbers(sequence.add(event(5)))).toEqual([]);
  expect(numbers(sequence.add(event(3)))).toEqual([]);
  expect(sequence.missing).toBeNull();
});

test('what is past is asked for from the oldest on, and told from what comes', () => {
  const sequence = new EventSequence();
  sequence.startAfter(40);
  expect(sequence.missing).toBe(1);
  expect(numbers(sequence.skipTo(39))).toEqual([]);
  expect(numbers([39, 40, 41].flatMap((number) => sequence.add(event(number))))).toEqual([39, 40, 41]);
  expect([40, 41].map((number) => sequence.isPast(number))).toEqual([true, false]);
  expect(sequence.missing).toBeNull();
});

test('keeps back what comes after a gap, and names the gap', () => {
  const sequence = new EventSequence();
  sequence.startAfter(0);
  expect(numbers(sequence.add(event(3)))).toEqual([]);
  expect(sequence.missing).toBe(1);
  expect(numbers(sequence.add(event(1)))).toEqual([1]);
  expect(sequence.missing).toBe(2);
  expect(numbers(sequence.add(event(2)))).toEqual([2, 3]);
  expect(sequence.missing).toBeNull();
});

test('knows from a reply that the last event was lost', () => {
  const sequence = new EventSequence();
  sequence.startAfter(7);
  sequence.skipTo(8);
  sequence.heardOf(9);
  expect(sequence.missing).toBe(8);
  expect(sequence.hasGivenOn(9)).toBe(false);
  expect(numbers([...sequence.add(event(8)), ...sequence.add(event(9))])).toEqual([8, 9]);
  expect(sequence.hasGivenOn(9)).toBe(true);
});

test('goes on after events that have left the ring', () => {
  const sequence = new EventSequence();
  sequence.startAfter(1);
  expect(numbers(sequence.add(event(40)))).toEqual([]);
  expect(numbers(sequence.skipTo(40))).toEqual([40]);
  expect(sequence.missing).toBeNull();
});

test('any order of arrival, with doubles, gives the same order on', () => {
  const sequence = new EventSequence();
  sequence.startAfter(0);
  const arrivals = [4, 4, 2, 6, 1, 2, 5, 3, 1, 6];
  expect(numbers(arrivals.flatMap((number) => sequence.add(event(number))))).toEqual([1, 2, 3, 4, 5, 6]);
});
