import { betterOffset, offsetAfterMessage } from '@/components/api/device-clock';

test('the offset is the server’s time less the middle of the exchange, known to half the round trip', () => {
  expect(betterOffset(null, { sentMs: 1000, receivedMs: 1100, serverMs: 6050 })).toEqual({ offsetMs: 5000, uMs: 50 });
});

test('a quicker exchange is believed, a slower one is not', () => {
  const first = betterOffset(null, { sentMs: 0, receivedMs: 100, serverMs: 5050 });
  expect(betterOffset(first, { sentMs: 1000, receivedMs: 1400, serverMs: 6300 })).toBe(first);
  expect(betterOffset(first, { sentMs: 1000, receivedMs: 1020, serverMs: 6020 })).toEqual({ offsetMs: 5010, uMs: 10 });
});

test('a clock that was set is believed at the next exchange, however slow that is', () => {
  const before = betterOffset(null, { sentMs: 0, receivedMs: 10, serverMs: 5 });
  const after = betterOffset(before, { sentMs: 100_000, receivedMs: 100_400, serverMs: 28_200 });
  expect(after).toEqual({ offsetMs: -72_000, uMs: 200 });
  // A slow answer alone contradicts nothing.
  expect(betterOffset(after, { sentMs: 200_000, receivedMs: 203_000, serverMs: 129_000 })).toEqual(after);
});

test('a message of a live stream moves the time on where a clock was set, and never back: it may only be late', () => {
  const before = betterOffset(null, { sentMs: 0, receivedMs: 10, serverMs: 5 });
  expect(offsetAfterMessage(before, { receivedMs: 5000, serverMs: 3000 })).toBe(before);
  expect(offsetAfterMessage(before, { receivedMs: 5000, serverMs: 5050 })).toBe(before);
  expect(offsetAfterMessage(before, { receivedMs: 5000, serverMs: 125_000 })).toEqual({ offsetMs: 120_000, uMs: 250 });
  expect(offsetAfterMessage(null, { receivedMs: 5000, serverMs: 4000 })).toEqual({ offsetMs: -1000, uMs: 250 });
});
