import type { ReplyBody } from '@/firmware-protocol/codec';
import { sealed } from '@/scripts/soak/fuzz/almost-lines';
import { FirmwareScript, runAll, type FirmwareRun } from '@/tests/support/firmware-script';

/** Non-volatile memory: starts (SPEC 3.1), highest epoch (3.3), limits (8.10, 8.11); damage and wear. */
const NEVER_TAUGHT = { least: -3600, greatest: 3600, speed: 200_000, acceleration: 200_000, home: 100_000 };
const TAUGHT = { least: -7778, greatest: 7778, speed: 266_666, acceleration: 88_888, home: 133_333 };
const TEACH = 'teach -7778 7778 266666 88888 133333';

const session = (boot: number) => `${boot.toString(16).toUpperCase().padStart(8, '0').slice(4)}0001`;

const GREATEST_EPOCH = 4_294_967_295;

/** Starts on each memory, and asks for identifier and limits; `boot`: the identifier that is expected, for the session. */
function look(cases: readonly { memory: string; boot: number }[]) {
  const scripts = cases.map(({ memory, boot }) => {
    const script = new FirmwareScript({ memory }).wait(100).raw(sealed('q 0 00000000 0 ident')).wait(20).hello(GREATEST_EPOCH);
    return script.order('limits', { session: session(boot), epoch: GREATEST_EPOCH });
  });
  return runAll(scripts).map(({ replies }) => {
    const [ident, , limits] = replies.map(({ body }) => body);
    return { boot: ident?.word === 'hi' ? Number.parseInt(ident.boot, 16) : null, limits };
  });
}

const fenced = (memory: string, epoch: number) => new FirmwareScript({ memory }).wait(100).hello(epoch).run().last.body;
const leastOf = (limits: ReplyBody | undefined) => (limits?.word === 'lim' ? limits.least : null);

const memoryOf = (run: FirmwareRun, index = 0) => run.host.dumps[index]?.memory as string;

function taughtMemory(): string {
  return memoryOf(new FirmwareScript().wait(100).hello(41).order(TEACH, { epoch: 41 }).wait(300).put('dump').run());
}

test('a memory never written gives the first start, no fence and the limits of SPEC 8.11', () => {
  expect(look([{ memory: '', boot: 1 }])).toEqual([{ boot: 1, limits: { word: 'lim', ...NEVER_TAUGHT } }]);
});

test('what was taught and the highest epoch outlive a restart; each start has a new identifier', () => {
  const memory = taughtMemory();
  expect(look([{ memory, boot: 2 }])).toEqual([{ boot: 2, limits: { word: 'lim', ...TAUGHT } }]);
  expect(fenced(memory, 40)).toEqual({ word: 'no', code: 'epoch', detail: 41 });
  expect(fenced(memory, 41)).toMatchObject({ word: 'hi' });
});

test('power that fails in any byte of a write leaves the old limits or the new ones', () => {
  const first = taughtMemory();
  const scripts = Array.from({ length: 33 }, (_, bytes) => {
    const script = new FirmwareScript({ memory: first }).wait(100).hello(41).put(`power ${bytes}`);
    return script
      .order('teach -50 50 100000 100000 50000', { session: session(2), epoch: 41 })
      .wait(300)
      .put('dump');
  });
  const found = look(runAll(scripts).map((run) => ({ memory: memoryOf(run), boot: 3 })));
  const least = found.map(({ limits }) => leastOf(limits));
  const turn = least.indexOf(-50);
  expect(turn).toBeGreaterThan(5);
  expect(least).toEqual(least.map((_, bytes) => (bytes < turn ? TAUGHT.least : -50)));
  expect(found.map(({ boot }) => boot)).toEqual(found.map(() => 3));
});

test('power that fails while a start is counted repeats no identifier once anything of it was written', () => {
  const first = memoryOf(new FirmwareScript().wait(100).put('dump').run());
  const scripts = [0, 1, 2, 3, 4, 5, 6].map((bytes) => {
    const script = new FirmwareScript({ memory: first });
    script.entries.splice(-1, 0, [0, `power ${bytes}`]);
    return script.wait(100).put('dump');
  });
  const found = look(runAll(scripts).map((run) => ({ memory: memoryOf(run), boot: 3 })));
  expect(found.map(({ boot }) => boot)).toEqual([2, 3, 3, 3, 3, 3, 3]);
});

test('damage anywhere is noticed: limits are the taught ones or those of SPEC 8.11, identifiers are new', () => {
  const bytes = Buffer.from(taughtMemory(), 'hex');
  const used = [...bytes.keys()].filter((at) => bytes[at] !== 0xff);
  const damaged = used.flatMap((at) =>
    [0x01, 0x80, 0xff].map((bits) => {
      const copy = Buffer.from(bytes);
      copy[at] = (copy[at] as number) ^ bits;
      return { memory: copy.toString('hex'), boot: 2 };
    }),
  );
  expect(damaged.length).toBeGreaterThan(90);
  for (const { boot, limits } of look(damaged)) {
    expect([2, 3]).toContain(boot);
    if (boot === 2) expect([NEVER_TAUGHT.least, TAUGHT.least]).toContain(leastOf(limits));
  }
});

test('starts and epochs wear no byte out: of 100 of each, no byte is written more often than 20 times', () => {
  const script = new FirmwareScript();
  for (let start = 1; start <= 100; start += 1) script.wait(100).hello(start).wait(200).put('dump').put('start power');
  const { dumps } = script.run().host;
  const changes = new Map<number, number>();
  for (const [index, { memory }] of dumps.entries()) {
    const before = Buffer.from(dumps[index - 1]?.memory ?? '', 'hex');
    Buffer.from(memory, 'hex').forEach((byte, at) => byte !== (before[at] ?? 0xff) && changes.set(at, (changes.get(at) ?? 0) + 1));
  }
  expect(Math.max(...changes.values())).toBeLessThanOrEqual(20);
  const last = dumps.at(-1);
  // 6 bytes of each record, of which the upper ones of the numbers are written anew only in a fresh slot.
  expect(last?.writes).toBeLessThan(100 * 2 * 6);
  expect(fenced(last?.memory as string, 99)).toEqual({ word: 'no', code: 'epoch', detail: 100 });
});
