import * as fc from 'fast-check';
import {
  BOOT_CAUSES,
  decodeLine,
  encode,
  END_CAUSES,
  hex8,
  LineSplitter,
  MAX_LINE_BYTES,
  STATES,
  type Message,
} from '@/firmware-protocol/codec';

const identifier = fc.integer({ min: 0, max: 0xffffffff }).map(hex8);
const number = fc.nat(65_535);
const epoch = fc.nat(4_294_967_295);
const position = fc.integer({ min: -9_999_999, max: 9_999_999 }).map((value) => value + 0);
const place = fc.option(position);
const rate = fc.integer({ min: 1, max: 99_999_999 });
const us = fc.integer({ min: 0, max: 999_999_999_999_999 });
const just = <const T extends string>(word: T) => ({ word: fc.constant(word) });
const record = fc.record;

const order = fc.oneof(
  ...(['ident', 'status', 'renew', 'limits', 'hold', 'off'] as const).map((word) => record(just(word))),
  record({ ...just('hello'), major: fc.nat(99), minor: fc.nat(99) }),
  record({ ...just('events'), from: epoch }),
  record({ ...just('home'), tag: identifier }),
  record({ ...just('move'), tag: identifier, position, speed: rate, acceleration: rate, beginUs: fc.option(us) }),
  record({ ...just('nudge'), tag: identifier, steps: position }),
  record({
    ...just('teach'),
    least: fc.integer({ min: -9_999_999, max: -1 }),
    greatest: fc.nat(9_999_999),
    speed: fc.integer({ min: 50_000, max: 99_999_999 }),
    acceleration: rate,
    home: fc.integer({ min: 1, max: 50_000 }),
  }),
  record({ ...just('stop'), drivers: fc.constantFrom('keep' as const, 'free' as const) }),
);

const body = fc.oneof(
  record({ ...just('ok'), state: fc.constantFrom(...STATES), position: place, flags: fc.nat(0xfff), event: epoch, dropped: number }),
  record({ ...just('no'), code: fc.stringMatching(/^[a-z]{1,9}$/), detail: position }),
  record({ ...just('lim'), least: position, greatest: position, speed: rate, acceleration: rate, home: rate }),
  record({
    ...just('hi'),
    major: fc.nat(99),
    minor: fc.nat(99),
    boot: identifier,
    session: identifier,
    resolutionUs: fc.integer({ min: 1, max: 9999 }),
    capabilities: number,
    firmware: fc.stringMatching(/^[a-z0-9.-]{1,12}$/),
  }),
);

const what = fc.oneof(
  record({ ...just('boot'), cause: fc.constantFrom(...BOOT_CAUSES) }),
  record({ ...just('warn'), tag: identifier }),
  record({ word: fc.constantFrom('began' as const, 'homed' as const), tag: identifier, position: place }),
  record({ ...just('ended'), tag: identifier, position: place, cause: fc.constantFrom(...END_CAUSES) }),
  record({ ...just('edge'), position: place, direction: fc.constantFrom('ccw' as const, 'cw' as const) }),
  record({ ...just('interlock'), closed: fc.boolean() }),
  record({ ...just('supply'), present: fc.boolean() }),
  record({ ...just('key'), on: fc.boolean() }),
  record({ word: fc.constantFrom('lease' as const, 'limit' as const), position: place }),
);

const message: fc.Arbitrary<Message> = fc.oneof(
  record({ kind: fc.constant('request' as const), epoch, session: identifier, number, order }),
  record({ kind: fc.constant('reply' as const), session: identifier, number, receivedUs: us, turnUs: fc.nat(999_999), body }),
  record({ kind: fc.constant('event' as const), number: fc.integer({ min: 1, max: 4_294_967_295 }), atUs: us, what }),
);

const SEED = 20_250_117;
/** Lines tried in each of the three properties; together about 1.2 × 10⁵. */
const RUNS = 40_000;

test('every message comes back as it was written and fits into a line', () => {
  fc.assert(
    fc.property(message, (sent) => {
      const line = encode(sent);
      expect(line.length).toBeLessThanOrEqual(MAX_LINE_BYTES);
      expect(decodeLine(line.slice(0, -1))).toEqual(sent);
    }),
    { seed: SEED, numRuns: RUNS / 4 },
  );
});

test('no line with one flipped bit is accepted, wherever the bit lies, the line feed included', () => {
  fc.assert(
    fc.property(message, fc.nat(MAX_LINE_BYTES * 8 - 1), (sent, place) => {
      const line = encode(sent);
      const index = (place >> 3) % line.length;
      const flipped = line.slice(0, index) + String.fromCharCode(line.charCodeAt(index) ^ (1 << (place & 7))) + line.slice(index + 1);
      for (const item of new LineSplitter().push(`${flipped}\n`)) {
        if (item.kind !== 'garbage' && item.kind !== 'blank') throw new Error(`accepted ${JSON.stringify(flipped)}`);
      }
    }),
    { seed: SEED, numRuns: RUNS },
  );
});

test('every single bit of one line of each kind is guarded', () => {
  for (const sent of fc.sample(message, { seed: SEED, numRuns: 60 })) {
    const line = encode(sent);
    for (let bit = 0; bit < line.length * 8; bit += 1) {
      const index = bit >> 3;
      const flipped = line.slice(0, index) + String.fromCharCode(line.charCodeAt(index) ^ (1 << (bit & 7))) + line.slice(index + 1);
      const accepted = new LineSplitter().push(`${flipped}\n`).filter((item) => item.kind !== 'garbage' && item.kind !== 'blank');
      expect(accepted).toEqual([]);
    }
  }
});

test('noise yields items with a reason, never an exception and never a message', () => {
  const bytes = fc.array(fc.nat(255), { maxLength: 200 }).map((codes) => String.fromCharCode(...codes));
  const nearly = fc
    .array(fc.constantFrom('q', 'r', 'e', ' ', '0', '1', 'move', 'ok', 'A', 'F', '.', '-', '\n', '\r'), { maxLength: 60 })
    .map((pieces) => pieces.join(''));
  fc.assert(
    fc.property(fc.oneof(bytes, nearly), (noise) => {
      for (const item of new LineSplitter().push(`${noise}\n`)) expect(['garbage', 'blank']).toContain(item.kind);
    }),
    { seed: SEED, numRuns: RUNS },
  );
});
