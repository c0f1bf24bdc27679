import { reading, World } from './spot-world';

/** What waits for the server while pages come and go. */

test('a page that breaks down while the server is away loses at most a second; the next one goes on, sends all in order and once', async () => {
  const before = await reading();
  await before.watch(2);
  before.answers = 'away';
  await before.watch(30);
  expect(before.reader.view().sender).toMatchObject({ unkept: null });
  const heldMost = before.reader.view().sender.buffer.held;
  const after = before.reloaded();
  after.reader.resume({ id: 'eye 1', name: 'Eye' });
  await after.watch(60);
  const { found, buffer, kept } = after.reader.view().sender;
  expect(heldMost - found).toBeLessThanOrEqual(10);
  expect(after.reader.view()).toMatchObject({ sending: true, camera: { kind: 'open' } });
  const times = after.samples.map(({ time_utc: time }) => Date.parse(time));
  expect(times).toEqual([...new Set(times)].sort((a, b) => a - b));
  // What the device held, and all of the next page but the second in which its camera is found.
  expect(buffer.stored + buffer.held).toBeGreaterThanOrEqual(found + 590);
  expect(kept).toBeLessThanOrEqual(20);
  expect([...after.disk.pieces.values()].every(({ samples }) => samples.length > 0)).toBe(true);
});

test('a batch whose answer was lost with the page is sent again: the same instants, which the server knows', async () => {
  const before = await reading();
  await before.watch(3);
  before.answers = 'away';
  await before.watch(2);
  // The server stored it, and the page is gone before it hears of it.
  const lost = before.reader.view().sender.buffer.underWay ?? [];
  expect(lost.length).toBeGreaterThan(0);
  const after = before.reloaded();
  await after.watch(3);
  const sent = new Set(after.samples.map(({ time_utc: time, value }) => `${time} ${value}`));
  const lostLines = lost.flatMap(({ samples }) =>
    samples.map(({ utcMs, mm }) => `${new Date(utcMs).toISOString().slice(0, -1)}000Z ${mm}`),
  );
  expect(lostLines.filter((line) => !sent.has(line))).toEqual([]);
});

test('a device that keeps nothing is told; what waits is sent all the same', async () => {
  const world = await reading();
  world.disk.full = true;
  await world.watch(3);
  expect(world.reader.view().sender).toMatchObject({ unkept: 'The disk is full', trouble: null, kept: 0 });
  expect(world.samples.length).toBeGreaterThan(10);
  world.disk.full = false;
  await world.watch(32);
  expect(world.reader.view().sender.unkept).toBeNull();
});

test('a camera that the browser calls by another id after a reload is known by its name, unless two bear it', async () => {
  const world = new World();
  world.cameras = [
    { id: 'eye 1', name: 'Eye' },
    { id: 'other', name: 'Other' },
  ];
  world.reader.resume({ id: 'eye of last week', name: 'Eye' });
  await world.watch(1);
  expect(world.opened).toEqual(['eye 1']);
  expect(world.reader.view().camera).toMatchObject({ kind: 'open', id: 'eye 1', before: 'eye of last week' });
  const two = new World();
  two.cameras = ['eye 1', 'eye 2'].map((id) => ({ id, name: 'Eye' }));
  two.reader.resume({ id: 'eye of last week', name: 'Eye' });
  await two.watch(1);
  expect(two.opened).toEqual(['eye of last week']);
});
