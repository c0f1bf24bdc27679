import { assert, property, uint8Array, boolean } from 'fast-check';
import { readMessage } from '@/server/ingest/read-message';

const now = Date.UTC(2031, 1, 14, 20);
const read = (text: string, mapping: Partial<Parameters<typeof readMessage>[1]> = {}, retained = false) =>
  readMessage({ payload: Buffer.from(text), retained }, { valuePath: null, time: null, ...mapping }, now);

test('a bare number is stamped as it arrives', () => {
  expect(read(' 21.375\n')).toEqual({ utcMs: now, value: 21.375 });
  expect(read('-1e-3')).toEqual({ utcMs: now, value: -0.001 });
});

test('a number in JSON, with its own time in each form', () => {
  const text = '{"t": "2031-02-14T19:59:59.5Z", "s": 1928865599.25, "ms": 1928865599750, "values": [{"v": 3}, {"v": "4.5"}]}';
  const value = { valuePath: 'values[1].v' };
  expect(read(text, value)).toEqual({ utcMs: now, value: 4.5 });
  expect(read(text, { ...value, time: { path: 't', form: 'iso' } })).toEqual({ utcMs: now - 500, value: 4.5 });
  expect(read(text, { ...value, time: { path: 'ms', form: 'ms' } })).toEqual({ utcMs: 1928865599750, value: 4.5 });
  expect(read(text, { ...value, time: { path: 's', form: 's' } })).toEqual({ utcMs: 1928865599250, value: 4.5 });
});

test('a stamp in microseconds loses none of them', () => {
  const timed = { valuePath: 'v', time: { path: 't', form: 'us' as const } };
  for (const us of [1_928_865_599_000_001, 1_928_865_599_750_123, 1_928_865_599_999_999]) {
    const found = read(`{"v": 1, "t": ${String(us)}}`, timed);
    expect(typeof found === 'string' ? found : Math.round(found.utcMs * 1000)).toBe(us);
  }
  expect(read('{"v": 1, "t": "now"}', timed)).toMatch(/a number of microseconds since 1970 is needed/);
});

test('a kept message counts only with its own time', () => {
  expect(read('3', {}, true)).toMatch(/kept by the broker from before/);
  const timed = { valuePath: 'v', time: { path: 't', form: 'iso' as const } };
  expect(read('{"v": 3, "t": "2031-02-14T19:00:00Z"}', timed, true)).toEqual({ utcMs: now - 3_600_000, value: 3 });
});

test.each([
  ['21,5', {}, /finite number with a decimal point/],
  ['', {}, /finite number/],
  ['0x10', {}, /finite number/],
  ['NaN', {}, /finite number/],
  ['1e999', {}, /finite number/],
  ['not json', { valuePath: 'v' }, /is not JSON/],
  ['{"v": null}', { valuePath: 'v' }, /has at v null/],
  ['{"v": true}', { valuePath: 'v' }, /has at v true/],
  ['{}', { valuePath: '__proto__.v' }, /has at __proto__.v nothing/],
  ['{"v": 1}', { valuePath: 'v', time: { path: 't', form: 'iso' as const } }, /has at t nothing; UTC as/],
  ['{"v": 1, "t": "2031-02-14T20:02:00Z"}', { valuePath: 'v', time: { path: 't', form: 'iso' as const } }, /120 s in the future/],
  ['9'.repeat(70_000), {}, /longer than 64 KiB/],
])('%.40s is refused in words', (text, mapping, reason) => {
  expect(read(text, mapping)).toMatch(reason);
});

test('any bytes give a finite sample or a sentence', () => {
  assert(
    property(uint8Array({ maxLength: 200 }), boolean(), (payload, json) => {
      const found = readMessage({ payload, retained: false }, { valuePath: json ? 'v' : null, time: null }, now);
      return typeof found === 'string' ? found.length > 0 : Number.isFinite(found.value);
    }),
    { numRuns: 500 },
  );
});
