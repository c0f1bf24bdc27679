import { betterOffset } from '@/components/api/device-clock';

test('the offset is the server’s time less the middle of the exchange, known to half the round trip', () => {
  expect(betterOffset(null, { sentMs: 1000, receivedMs: 1100, serverMs: 6050 })).toEqual({ offsetMs: 5000, uMs: 50 });
});

test('a quicker exchange is believed, a slower one is not', () => {
  const first = betterOffset(null, { sentMs: 0, receivedMs: 100, serverMs: 5050 });
  expect(betterOffset(first, { sentMs: 1000, receivedMs: 1400, serverMs: 9999 })).toBe(first);
  expect(betterOffset(first, { sentMs: 1000, receivedMs: 1020, serverMs: 6020 })).toEqual({ offsetMs: 5010, uMs: 10 });
});
