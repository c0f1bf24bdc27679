import { makeBench, runStart, shortProtocol, underWay, type Bench } from './rig-bench';

/** A request that comes again, long after or to the next process, under the key it came with first (draft-ietf-httpapi-idempotency-key-header-07). */

const times = ({ store }: Bench, kind: string) => store.kinds().filter((one) => one === kind).length;

test('a hold that comes again to the next process is in the log once, and does not hold a run that somebody has resumed since', async () => {
  const bench = await underWay(30);
  bench.driver.hold('Ben', 'user-1 key-1');
  await bench.pass(1);
  await bench.restart(5);
  await bench.pass(5);
  expect(await bench.driver.resume('Cleo')).toMatchObject({ ok: true });
  await bench.pass(5);
  expect(bench.driver.hold('Ben', 'user-1 key-1')).toMatchObject({ ok: true });
  await bench.pass(5);
  expect([bench.driver.facts().state, times(bench, 'hold-requested')]).toEqual(['running', 1]);
  bench.driver.hold('Ben', 'user-1 key-2');
  await bench.pass(5);
  expect([bench.driver.facts().state, times(bench, 'hold-requested')]).toEqual(['held', 2]);
});

test.each(['hold', 'stop'] as const)(
  'a %s that comes twice before the first is saved goes out twice and is in the log once',
  async (act) => {
    const bench = await underWay(30);
    const before = bench.link.commands.length;
    const answers = ['sent', 'sent again'].map(() => bench.driver[act]('Ben', 'user-1 key-1').ok);
    expect(answers).toEqual([true, true]);
    expect(bench.link.commands.slice(before).map(({ kind }) => kind)).toEqual([act, act]);
    await bench.pass(5);
    expect([bench.driver.facts().state, times(bench, `${act}-requested`)]).toEqual([act === 'hold' ? 'held' : 'stopped', 1]);
  },
);

test('a hold after this dwell that comes again after it was taken back holds nothing', async () => {
  const bench = makeBench(runStart(shortProtocol));
  bench.driver.start();
  await bench.pass(60);
  bench.driver.holdAfterDwell('Ben', 'user-1 key-1');
  await bench.pass(1);
  await bench.driver.requests.withdrawHold('Ben');
  expect(bench.driver.holdAfterDwell('Ben', 'user-1 key-1')).toMatchObject({ ok: true });
  await bench.pass(300);
  expect([bench.driver.facts().state, times(bench, 'hold-after-dwell-requested')]).toEqual(['finished', 1]);
});

test('whoever gives no key is taken at his word each time', async () => {
  const bench = await underWay(30);
  bench.driver.stop('Ben');
  bench.driver.stop('Ben');
  await bench.pass(5);
  expect(times(bench, 'stop-requested')).toBe(2);
});
