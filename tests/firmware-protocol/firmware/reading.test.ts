import { xoroshiro128plus } from 'pure-rand/generator/xoroshiro128plus';
import { uniformInt } from 'pure-rand/distribution/uniformInt';
import { decodeLine, encode, LineSplitter, type Item } from '@/firmware-protocol/codec';
import invalid from '@/firmware-protocol/vectors/invalid.json';
import streams from '@/firmware-protocol/vectors/streams.json';
import valid from '@/firmware-protocol/vectors/valid.json';
import { FRESH, readByFirmware } from '@/tests/support/firmware-host';
import { FirmwareScript, sealed } from '@/tests/support/firmware-script';

/** As the host program tells what a line says. A controller drops whatever is no request. */
function told(item: Item): string[] {
  if (item.kind === 'blank') return [];
  if (item.kind === 'unusable') return [`${item.epoch} ${item.session} ${item.number} refused ${item.code}`];
  if (item.kind !== 'request') return ['dropped'];
  const body = encode(item).slice('q '.length, -' 0000\n'.length);
  return [item.order.word === 'hello' ? body.replace(/ hello .*/, ' hello') : body];
}

describe('the firmware reads as the specification and the codec do', () => {
  test('all valid lines', () => {
    const lines = valid.vectors.map(({ line }) => line);
    expect(readByFirmware(lines.map((line) => `${line}\n`))).toEqual(lines.map((line) => told(decodeLine(line))));
  });

  test('all invalid lines', () => {
    const lines = invalid.vectors.map(({ line }) => line);
    expect(readByFirmware(lines.map((line) => `${line}\n`))).toEqual(lines.map(() => ['dropped']));
  });

  test('all streams, in their pieces', () => {
    const read = readByFirmware(streams.vectors.flatMap(({ chunks }) => [...chunks, FRESH]));
    const expected = streams.vectors.flatMap(({ chunks }) => {
      const splitter = new LineSplitter();
      return [...chunks.map((chunk) => splitter.push(chunk).flatMap(told)), []];
    });
    expect(read).toEqual(expected);
  });
});

/** In the suite 10⁵ lines; more by the environment. */
const LINES = Number(process.env.EVENFALL_FUZZ_LINES ?? 100_000);
const SEED = 20_260_412;
const TOKENS = (
  'q r e x 0 00 1 7 -1 -0 -9999999 9999999 10000000 65535 65536 99999999 100000000 4294967295 4294967296 00000000 1A2B0001 1a2b0001 FFFFFFFF 0000ABCD ' +
  'ABCD now free keep none ident hello status renew limits events home move hold stop off nudge teach mov statue ok no hi 000000012.345678 12.345678 ' +
  '999999999.999999 0000000123.45678 100 -100 99 1.5 A 9a'
).split(' ');

/** Lines between right and wrong: real ones changed by a token, a byte or a cut, most of them honestly sealed. */
function* almostLines(count: number): Generator<string> {
  const random = xoroshiro128plus(SEED);
  const upTo = (last: number) => uniformInt(random, 0, last);
  const requests = valid.vectors.filter(({ line }) => line.startsWith('q')).map(({ line }) => line.slice(0, -5));
  const token = () => TOKENS[upTo(TOKENS.length - 1)] as string;
  for (let made = 0; made < count; made += 1) {
    const fields = (requests[upTo(requests.length - 1)] as string).split(' ');
    for (let changes = upTo(2); changes > 0; changes -= 1) {
      const at = upTo(fields.length - 1);
      fields.splice(at, upTo(1), ...(upTo(4) === 0 ? [] : [token()]));
    }
    let line = sealed(fields.join(' ')).slice(0, -1);
    if (upTo(3) === 0) {
      const at = upTo(line.length - 1);
      line = line.slice(0, at) + String.fromCharCode(upTo(255)).replace('\n', ' ') + line.slice(at + upTo(1));
    }
    yield upTo(9) === 0 ? `${line}\r` : line;
  }
}

test(`${LINES} seeded lines between right and wrong are read as the codec reads them`, () => {
  const lines = [...almostLines(LINES)];
  const read = readByFirmware(lines.map((line) => `${line}\n`));
  const differing = lines.filter((line, index) => (read[index] ?? []).join() !== told(decodeLine(line)).join());
  expect(differing).toEqual([]);
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
