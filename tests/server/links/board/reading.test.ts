import { decodeLine, encode, LineSplitter, NO_SESSION, type Item, type OkBody, type Reply } from '@/firmware-protocol/codec';
import invalid from '@/firmware-protocol/vectors/invalid.json';
import streams from '@/firmware-protocol/vectors/streams.json';
import valid from '@/firmware-protocol/vectors/valid.json';
import { BoardBench } from '@/scripts/soak/board/board-bench';
import { almostLines, sealed } from '@/scripts/soak/fuzz/almost-lines';
import { BoardRam } from '@/tests/support/board-ram';

/** The firmware as built for the board, instruction by instruction: what it reads, what it drops, and that neither moves anything. */

const bench = new BoardBench();
bench.home();
const ram = new BoardRam(bench);
const homed = bench.keep();

/** A stop needs no session, and its answer tells position and dropped lines. */
const HOLD = encode({ kind: 'request', epoch: 0, session: NO_SESSION, number: 1, order: { word: 'hold' } });
const now = () => (bench.put(HOLD) as Reply).body as OkBody;
const steps = () => bench.edges.filter(({ pin }) => pin === 'step').length;
const repliesIn = (items: readonly Item[]) => items.filter((item): item is Reply => item.kind === 'reply');
const isRequest = (item: Item) => item.kind === 'request' || item.kind === 'unusable';

beforeEach(() => {
  homed();
  bench.edges.length = 0;
});

/** As if the vector's session had been opened, and its number came next. */
function openSessionOf({ epoch, session, number }: { epoch: number; session: string; number: number }): void {
  ram.write('core::session::current', 4, Number.parseInt(session, 16));
  ram.write('core::session::epochOfSession', 4, epoch);
  ram.write('core::session::last', 2, (number + 65_535) % 65_536);
  ram.write('core::session::requestLength', 1, 0);
}

/** Codes that say that the line itself was not understood, or not meant for this session. */
const MISREAD = ['word', 'field', 'session', 'epoch', 'old', 'reused'];

describe('valid lines on the board', () => {
  test.each(valid.vectors.map(({ why, line }) => [why, line] as const))('%s', (_why, line) => {
    const item = decodeLine(line);
    const { dropped } = now();
    if (item.kind === 'request' || item.kind === 'unusable') openSessionOf(item);
    const [reply, ...more] = repliesIn(bench.hears(`${line}\n`));
    expect(more).toEqual([]);
    if (item.kind !== 'request' && item.kind !== 'unusable') {
      expect(reply).toBeUndefined();
      expect(now().dropped - dropped).toBe(item.kind === 'blank' ? 0 : 1);
      return;
    }
    expect(reply).toMatchObject({ session: item.session, number: item.number });
    const { body } = reply as Reply;
    if (item.kind === 'unusable') return expect(body).toMatchObject({ word: 'no', code: item.code });
    if (item.order.word === 'teach' && body.word === 'lim') expect(body).toEqual({ ...item.order, word: 'lim' });
    // `field` is also the answer to limits that contradict each other (8.10).
    if (body.word === 'no' && item.order.word !== 'teach') expect(MISREAD).not.toContain(body.code);
    expect(['ok', 'hi', 'lim', 'no']).toContain(body.word);
  });
});

test.each(invalid.vectors.map(({ why, line }) => [why, line] as const))('is dropped and moves nothing: %s', (_why, line) => {
  const { dropped } = now();
  expect(repliesIn(bench.hears(`${line}\n`))).toEqual([]);
  expect(now().dropped - dropped).toBe(1);
  expect(steps()).toBe(0);
});

test.each(streams.vectors.map(({ why, chunks }) => [why, chunks] as const))('stream in its pieces: %s', (_why, chunks) => {
  const { dropped } = now();
  const splitter = new LineSplitter();
  for (const chunk of chunks) {
    const items = splitter.push(chunk);
    expect(repliesIn(bench.hears(chunk))).toHaveLength(items.filter(isRequest).length);
  }
  // What was begun and not ended is ended here, and dropped too where it is anything.
  const items = [...chunks, '\n'].reduce<{ all: Item[]; splitter: LineSplitter }>(
    (read, chunk) => ({ ...read, all: [...read.all, ...read.splitter.push(chunk)] }),
    { all: [], splitter: new LineSplitter() },
  ).all;
  bench.hears('\n');
  expect(now().dropped - dropped).toBe(items.filter((item) => !isRequest(item) && item.kind !== 'blank').length);
  expect(steps()).toBe(0);
});

test('a thousand seeded lines between right and wrong: each is answered or dropped as the codec reads it, nothing moves, and it still answers', () => {
  const { dropped } = now();
  let answered = 0;
  let expectedDrops = 0;
  for (const line of almostLines(1_000, 20_260_509)) {
    const item = decodeLine(line);
    if (isRequest(item)) answered += 1;
    else if (item.kind !== 'blank') expectedDrops += 1;
    const replies = repliesIn(bench.hears(`${line}\n`));
    if (replies.length !== Number(isRequest(item))) throw new Error(`${JSON.stringify(line)} got ${replies.length} answers`);
  }
  const after = now();
  expect(after.dropped - dropped).toBe(expectedDrops);
  expect(answered).toBeGreaterThan(100);
  expect(expectedDrops).toBeGreaterThan(100);
  // Among them were honest orders to switch off: what they take is the position, and nothing else.
  expect(after.state).toBe('rest');
  expect(steps()).toBe(0);
});

/**
 * The tenth planted fault: a controller that does not look at the check word. To it a spoilt line is what the same line with its check word
 * made right is to ours: `asRead` makes that of a line.
 */
function judgeSpoiltLines(asTaken: (line: string) => string): string[] {
  const { session } = bench.ask({ word: 'status' });
  const order = { word: 'move', tag: bench.nextTag(), position: 500, speed: 1_000_000, acceleration: 20_000_000, beginUs: null } as const;
  // A number ahead of all the renewals: it is not refused for being old.
  const move = encode({ kind: 'request', epoch: 1, session, number: 20_000, order });
  const ready = bench.keep();
  const wrong: string[] = [];
  for (let bit = 0; bit < (move.length - 1) * 8; bit += 1) {
    const at = bit >> 3;
    const spoilt = `${move.slice(0, at)}${String.fromCharCode(move.charCodeAt(at) ^ (1 << (bit & 7)))}${move.slice(at + 1)}`;
    if (bit % 20 === 0) bench.ask({ word: 'renew' });
    const answer = bench.put(asTaken(spoilt));
    if (answer === null) continue;
    bench.pass(30);
    if (steps() > 0) wrong.push(`obeyed ${spoilt.trim()}`);
    ready();
    bench.edges.length = 0;
    bench.ask({ word: 'renew' });
  }
  return wrong;
}

const withRightCheck = (line: string) => sealed(line.slice(0, line.lastIndexOf(' ')));

test('no move with a flipped bit is obeyed, whatever the bit, and a controller that looked past the check word would be found out', () => {
  expect(judgeSpoiltLines((line) => line)).toEqual([]);
  homed();
  expect(judgeSpoiltLines(withRightCheck).length).toBeGreaterThan(20);
});
