import { serialFactory } from '@/server/links/serial-line';
import { LinkWatch } from './link-watch';
import { ProcessBenches } from './process-benches';

/** Real time, end to end: the real serial port class, a pseudo-terminal, the controller's firmware on the emulated board. */
jest.setTimeout(60_000);

const benches = new ProcessBenches((process, clock) => serialFactory({ path: process.path, baudRate: 115_200, dtr: true }, clock));
const maker = benches.maker('a pseudo-terminal with the emulated board');
afterAll(() => maker.dispose());

test('moves through a frozen line, is found again after the port disappeared, and tells when its lease lapsed', async () => {
  const process = await benches.start('--board', '--homed');
  const bench = await benches.on(process);
  const watch = new LinkWatch(bench, 1);
  await watch.ready();
  expect(watch.link.controller()).toMatchObject({ firmware: 'evenfall-1.0', positionKnown: true });
  const first = watch.move(30);
  await watch.get('motion-began', { of: first });
  await process.tell('freeze 300');
  expect((await watch.get('motion-ended', { of: first })).cause).toBe('done');
  expect(await bench.trueAngleDeg()).toBeCloseTo(30, 9);

  const second = watch.move(-150);
  const began = await watch.get('motion-began', { of: second });
  await bench.unplug();
  await watch.get('lost');
  await bench.pass(3_000);
  await bench.plug();
  expect(await watch.get('ready', { nth: 1, withinMs: 15_000 })).toMatchObject({ sameBoot: true });
  const ended = await watch.get('motion-ended', { of: second });
  expect(ended.cause).toBe('lease');
  expect(ended.at.utcMs - began.at.utcMs).toBeLessThan(4_500);
  expect(ended.angleDeg).toBeCloseTo(await bench.trueAngleDeg(), 9);
  await watch.link.close();
});
