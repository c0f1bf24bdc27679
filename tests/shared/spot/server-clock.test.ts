import { afterExchange, clockUMs, utcMsAt } from '@/shared/spot/server-clock';

const start = Date.UTC(2031, 1, 14, 20);

test('an exchange puts the server into the middle of its round trip, known to half of it', () => {
  const clock = afterExchange(null, { sentMs: 1000, receivedMs: 1040, serverMs: start });
  expect(utcMsAt(clock, 1020)).toBe(start);
  expect(utcMsAt(clock, 1520)).toBe(start + 500);
  expect(clockUMs(clock, 1040)).toBe(20.5);
  expect(clockUMs(clock, 1040 + 600_000)).toBeCloseTo(80.5, 9);
});

test('a slower exchange changes nothing until what is known has grown older than it is wide', () => {
  const fast = afterExchange(null, { sentMs: 0, receivedMs: 10, serverMs: start });
  const slow = { sentMs: 1000, receivedMs: 1100, serverMs: start + 1060 };
  expect(afterExchange(fast, slow)).toBe(fast);
  const late = { sentMs: 1_000_000, receivedMs: 1_000_100, serverMs: start + 1_000_060 };
  expect(utcMsAt(afterExchange(fast, late), 1_000_050)).toBe(start + 1_000_060);
});

test('a server whose clock was set is believed at once', () => {
  const before = afterExchange(null, { sentMs: 0, receivedMs: 10, serverMs: start });
  const set = afterExchange(before, { sentMs: 1000, receivedMs: 1100, serverMs: start + 61_000 });
  expect(utcMsAt(set, 1050)).toBe(start + 61_000);
});
