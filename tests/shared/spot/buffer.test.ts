import * as fc from 'fast-check';
import {
  bufferAfter,
  countOfOthers,
  emptyBuffer,
  heldPieces,
  linesOf,
  type BufferEvent,
  type SpotBuffer,
  type SpotPiece,
} from '@/shared/spot/buffer';

const limits = { most: 500, batch: 150 };
const channel = 'light spot';
const empty = emptyBuffer(7000);
const after = (events: BufferEvent[], from: SpotBuffer = empty) =>
  events.reduce((buffer, event) => bufferAfter(buffer, event, limits), from);
const sample = (at: number) => ({ utcMs: at, mm: at / 10 });
const measured = (from: number, count: number, of = channel): BufferEvent[] =>
  Array.from({ length: count }, (_, i) => ({ type: 'measured', channel: of, sample: sample(from + i) }));
const send: BufferEvent = { type: 'send', channel };
const times = (pieces: readonly SpotPiece[] | null) => (pieces ?? []).flatMap(({ samples }) => samples.map(({ utcMs }) => utcMs));
const heldBy = (buffer: SpotBuffer) => times(heldPieces(buffer));
const left = (id: number, from: number, count: number, of = channel): SpotPiece => ({
  ...{ id, channel: of },
  samples: Array.from({ length: count }, (_, i) => sample(from + i)),
});

test('a batch is what waited, in order, and the same until it is answered', () => {
  const sent = after([...measured(0, 7), send]);
  expect(times(sent.underWay)).toEqual([0, 1, 2, 3, 4, 5, 6]);
  const later = after([...measured(7, 3), send, send], sent);
  expect(later.underWay).toBe(sent.underWay);
  const stored = after([{ type: 'stored' }, send], later);
  expect(stored).toMatchObject({ stored: 7, held: 3, dropped: null });
  expect(times(stored.underWay)).toEqual([7, 8, 9]);
});

test('after a long silence batches are full ones, none greater than what the server takes', () => {
  let buffer = after(measured(0, 430));
  const sizes: number[] = [];
  for (let i = 0; i < 9 && buffer.held > 0; i += 1) {
    buffer = after([send], buffer);
    sizes.push(times(buffer.underWay).length);
    buffer = after([{ type: 'stored' }], buffer);
  }
  expect(sizes.every((size) => size <= limits.batch)).toBe(true);
  expect(buffer).toMatchObject({ stored: 430, held: 0, dropped: null });
});

test('beyond the bound the oldest go, and it is told how many and between when', () => {
  const full = after(measured(1000, 800));
  expect(full.held).toBeLessThanOrEqual(limits.most);
  expect(full.dropped).toEqual({ count: 800 - full.held, fromUtcMs: 1000, toUtcMs: 1000 + (800 - full.held) - 1 });
  expect(heldBy(full)).toEqual(Array.from({ length: full.held }, (_, i) => 1800 - full.held + i));
});

test('what the server will never take is dropped, and nothing else', () => {
  const refused = after([...measured(0, 5), send, ...measured(5, 2), { type: 'refused' }]);
  expect(refused).toMatchObject({ held: 2, stored: 0, dropped: { count: 5, fromUtcMs: 0, toUtcMs: 4 } });
});

test('what a page before left is sent before what was measured since, within the same bound', () => {
  const begun = after([...measured(900, 20), { type: 'found', pieces: [left(1, 100, 90), left(2, 190, 100)] }, send]);
  expect(begun.held).toBe(210);
  expect(times(begun.underWay)).toEqual(Array.from({ length: 90 }, (_, i) => 100 + i));
  expect(heldBy(begun)).toEqual([...Array.from({ length: 190 }, (_, i) => 100 + i), ...Array.from({ length: 20 }, (_, i) => 900 + i)]);
  const tooMuch = after([{ type: 'found', pieces: Array.from({ length: 7 }, (_, i) => left(i, 100 * i, 100)) }]);
  expect(tooMuch).toMatchObject({ held: 500, dropped: { count: 200, fromUtcMs: 0, toUtcMs: 199 } });
});

test('samples go to the channel they were measured for; those of another one wait', () => {
  const changed = after([...measured(0, 4), ...measured(4, 3, 'left edge'), { type: 'send', channel: 'left edge' }]);
  expect(times(changed.underWay)).toEqual([4, 5, 6]);
  expect(countOfOthers(changed, 'left edge')).toBe(4);
  // The batch without an answer waits while another channel is chosen, and is the first of its own again.
  const back = after([send], changed);
  expect(times(back.underWay)).toEqual([0, 1, 2, 3]);
  expect(times(after([{ type: 'stored' }, { type: 'send', channel: 'left edge' }], back).underWay)).toEqual([4, 5, 6]);
});

test('whatever happens, every sample is held, stored or told as dropped, in order and within the bound, in pieces whose ids grow', () => {
  const happening = fc.oneof(
    fc.integer({ min: 1, max: 120 }).map((count) => ({ kind: 'measured' as const, count })),
    fc.constantFrom({ kind: 'send' as const }, { kind: 'stored' as const }, { kind: 'refused' as const }),
  );
  fc.assert(
    fc.property(fc.array(happening, { maxLength: 40 }), (story) => {
      let buffer = empty;
      let count = 0;
      for (const event of story) {
        const events: BufferEvent[] =
          event.kind === 'measured' ? measured(count, event.count) : event.kind === 'send' ? [send] : [{ type: event.kind }];
        count += event.kind === 'measured' ? event.count : 0;
        buffer = after(events, buffer);
        const held = heldBy(buffer);
        expect(held).toHaveLength(buffer.held);
        expect(buffer.held).toBeLessThanOrEqual(limits.most);
        expect(buffer.held + buffer.stored + (buffer.dropped?.count ?? 0)).toBe(count);
        expect(held).toEqual([...held].sort((a, b) => a - b));
        const ids = heldPieces(buffer).map(({ id }) => id);
        expect(ids).toEqual([...new Set(ids)].sort((a, b) => a - b));
        expect(ids.every((id) => id >= 7000 && id < buffer.nextId)).toBe(true);
      }
    }),
    { numRuns: 50 },
  );
});

test('lines are what the way in of devices reads, stamped to the microsecond', () => {
  expect(linesOf([{ id: 1, channel, samples: [{ utcMs: Date.UTC(2031, 1, 14, 20) + 100.25, mm: 12.5 }] }])).toBe(
    '{"channel":"light spot","time_utc":"2031-02-14T20:00:00.100250Z","value":12.5}',
  );
});
