import { decodeLine, LineSplitter } from '@/firmware-protocol/codec';
import invalid from '@/firmware-protocol/vectors/invalid.json';
import streams from '@/firmware-protocol/vectors/streams.json';
import valid from '@/firmware-protocol/vectors/valid.json';
import { almostLines, asRead, sealed } from '@/scripts/soak/fuzz/almost-lines';
import { FRESH, readByFirmware } from '@/scripts/soak/fuzz/firmware-host';
import { misread } from '@/scripts/soak/fuzz/try-lines';
import { FirmwareScript } from '@/tests/support/firmware-script';

describe('the firmware reads as the specification and the codec do', () => {
  test('all valid lines', () => {
    const lines = valid.vectors.map(({ line }) => line);
    expect(readByFirmware(lines.map((line) => `${line}\n`))).toEqual(lines.map((line) => asRead(decodeLine(line))));
  });

  test('all invalid lines', () => {
    const lines = invalid.vectors.map(({ line }) => line);
    expect(readByFirmware(lines.map((line) => `${line}\n`))).toEqual(lines.map(() => ['dropped']));
  });

  test('all streams, in their pieces', () => {
    const read = readByFirmware(streams.vectors.flatMap(({ chunks }) => [...chunks, FRESH]));
    const expected = streams.vectors.flatMap(({ chunks }) => {
      const splitter = new LineSplitter();
      return [...chunks.map((chunk) => splitter.push(chunk).flatMap(asRead)), []];
    });
    expect(read).toEqual(expected);
  });
});

/** In the suite 10⁵ lines; more by the environment. */
const LINES = Number(process.env.EVENFALL_FUZZ_LINES ?? 100_000);
const SEED = 20_260_412;
test(`${LINES} seeded lines between right and wrong are read as the codec reads them`, () => {
  const lines = [...almostLines(LINES, SEED)];
  expect(misread(lines)).toEqual([]);
  const kinds = new Set(lines.map((line) => decodeLine(line).kind));
  expect([...kinds].sort()).toEqual(['garbage', 'request', 'unusable']);
}, 300_000);

test('no line with a flipped bit moves anything, though the lease is live and the rig is homed', () => {
  const script = new FirmwareScript({ place: -20 }).wait(100).hello().order('renew').order('home 0000AAAA').renewing(20_000).order('renew');
  const good = sealed('q 7 00010001 30000 move 0000AAAB 500 100000 100000 now');
  const bits = [...good].flatMap((_, at) => [0, 1, 2, 3, 4, 5, 6, 7].map((bit) => [at, bit] as const));
  for (const [at, bit] of bits) {
    const flipped = good.slice(0, at) + String.fromCharCode(good.charCodeAt(at) ^ (1 << bit)) + good.slice(at + 1);
    script.raw(`${flipped}\n`).wait(1);
  }
  const beforeUs = 19_900_000;
  const run = script.order('status').raw(good).wait(500).run();
  expect(run.replies.at(-2)?.body).toMatchObject({ word: 'ok', state: 'rest', position: 0 });
  const dropped = run.replies.at(-2)?.body;
  // A flipped line feed joins its line to the next; a byte that becomes one cuts its own in two.
  expect(dropped?.word === 'ok' && dropped.dropped).toBeGreaterThanOrEqual(bits.length - 8);
  expect(run.stepsAfter(beforeUs).steps.length).toBeGreaterThan(0);
  expect(run.stepsAfter(beforeUs).steps[0]?.atUs).toBeGreaterThan((script.now - 520) * 1000);
});
