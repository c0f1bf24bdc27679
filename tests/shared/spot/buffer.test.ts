import * as fc from 'fast-check';
import { bufferAfter, emptyBuffer, linesOf, type BufferEvent, type SpotBuffer } from '@/shared/spot/buffer';

const limits = { most: 500, batch: 150 };
const after = (events: BufferEvent[], from: SpotBuffer = emptyBuffer) =>
  events.reduce((buffer, event) => bufferAfter(buffer, event, limits), from);
const measured = (from: number, count: number): BufferEvent[] =>
  Array.from({ length: count }, (_, i) => ({ type: 'measured', sample: { utcMs: from + i, mm: (from + i) / 10 } }));
const times = (samples: readonly { utcMs: number }[] | null) => (samples ?? []).map(({ utcMs }) => utcMs);
const heldBy = ({ underWay, pieces, open }: SpotBuffer) => [...times(underWay), ...pieces.flatMap(times), ...times(open)];

test('a batch is what waited, in order, and the same until it is answered', () => {
  const sent = after([...measured(0, 7), { type: 'send' }]);
  expect(times(sent.underWay)).toEqual([0, 1, 2, 3, 4, 5, 6]);
  const later = after([...measured(7, 3), { type: 'send' }, { type: 'send' }], sent);
  expect(later.underWay).toBe(sent.underWay);
  const stored = after([{ type: 'stored' }, { type: 'send' }], later);
  expect(stored).toMatchObject({ stored: 7, held: 3, dropped: null });
  expect(times(stored.underWay)).toEqual([7, 8, 9]);
});

test('after a long silence batches are full ones, none greater than what the server takes', () => {
  let buffer = after(measured(0, 430));
  const sizes: number[] = [];
  for (let i = 0; i < 9 && buffer.held > 0; i += 1) {
    buffer = after([{ type: 'send' }], buffer);
    sizes.push(buffer.underWay?.length ?? 0);
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
  const refused = after([...measured(0, 5), { type: 'send' }, ...measured(5, 2), { type: 'refused' }]);
  expect(refused).toMatchObject({ held: 2, stored: 0, dropped: { count: 5, fromUtcMs: 0, toUtcMs: 4 } });
});

test('whatever happens, every sample is held, stored or told as dropped, in order and within the bound', () => {
  const happening = fc.oneof(
    fc.integer({ min: 1, max: 120 }).map((count) => ({ kind: 'measured' as const, count })),
    fc.constantFrom({ kind: 'send' as const }, { kind: 'stored' as const }, { kind: 'refused' as const }),
  );
  fc.assert(
    fc.property(fc.array(happening, { maxLength: 40 }), (story) => {
      let buffer = emptyBuffer;
      let count = 0;
      for (const event of story) {
        const events = event.kind === 'measured' ? measured(count, event.count) : [{ type: event.kind }];
        count += event.kind === 'measured' ? event.count : 0;
        buffer = after(events, buffer);
        const held = heldBy(buffer);
        expect(held).toHaveLength(buffer.held);
        expect(buffer.held).toBeLessThanOrEqual(limits.most);
        expect(buffer.held + buffer.stored + (buffer.dropped?.count ?? 0)).toBe(count);
        expect(held).toEqual([...held].sort((a, b) => a - b));
      }
    }),
    { numRuns: 50 },
  );
});

test('lines are what the way in of devices reads, stamped to the microsecond', () => {
  expect(linesOf('light spot', [{ utcMs: Date.UTC(2031, 1, 14, 20) + 100.25, mm: 12.5 }])).toBe(
    '{"channel":"light spot","time_utc":"2031-02-14T20:00:00.100250Z","value":12.5}',
  );
});
