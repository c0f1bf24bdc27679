import { picture, plan, reading, startUtcMs, World } from './spot-world';

test('positions on the scale reach the server once each, with the moment the pictures were taken, by the server’s clock', async () => {
  const world = await reading();
  await world.watch(3);
  expect(world.awake).toBe(true);
  world.reader.end();
  await world.watch(2);
  const { samples } = world;
  expect(samples).toHaveLength(30);
  expect(Date.parse(samples[0]?.time_utc ?? '')).toBe(startUtcMs + 5100 - 30);
  expect(new Set(samples.map(({ time_utc: time }) => time)).size).toBe(30);
  for (const { channel, value } of samples) {
    expect(channel).toBe('light spot');
    // Column 90 lies 70 columns of 0.5 mm from the first mark.
    expect(Math.abs(value - 35)).toBeLessThan(0.06);
  }
  expect(world.reader.view()).toMatchObject({ sending: false, sender: { buffer: { stored: 30, held: 0 }, trouble: null }, gaps: [] });
  expect(world.reader.view().warnings.join()).toMatch(/clock of this device is .* ahead of the server's/);
  expect(world.reader.view().camera).toMatchObject({ kind: 'open', free: ['focus'] });
});

test('while the server is away nothing is lost, and each sample is stored once when it is back', async () => {
  const world = await reading();
  await world.watch(2);
  world.answers = 'away';
  await world.watch(20);
  expect(world.reader.view().sender.trouble).toBe('The server does not answer.');
  expect(world.reader.view().sender.buffer.held).toBeGreaterThan(180);
  world.answers = 'yes';
  await world.watch(40);
  expect(world.reader.view().sender.trouble).toBeNull();
  const times = world.samples.map(({ time_utc: time }) => time);
  expect(times).toEqual([...new Set(times)].sort());
  expect(times.length + world.reader.view().sender.buffer.held).toBe(620);
});

test('a revoked token keeps what was read until another one is given; what is refused for good is told', async () => {
  const world = await reading();
  world.answers = 'revoked';
  await world.watch(3);
  expect(world.reader.view().sender).toMatchObject({ trouble: 'It is wrong-token.', buffer: { dropped: null } });
  world.answers = 'refuses';
  await world.watch(12);
  expect(world.reader.view().sender).toMatchObject({ refused: 'It is unreadable-data.' });
  expect(world.reader.view().sender.buffer.dropped?.count).toBeGreaterThan(0);
});

test('a camera unplugged in the night is told and looked for, the same one; the gap is told, nothing is stored of it', async () => {
  const world = await reading();
  await world.watch(2);
  world.plugged = false;
  world.events?.ended();
  world.events = null;
  await world.watch(10);
  expect(world.reader.view()).toMatchObject({ camera: { kind: 'lost', why: 'No camera is connected.' }, spot: null, sending: true });
  world.plugged = true;
  await world.watch(5);
  expect(world.reader.view().camera.kind).toBe('open');
  expect(world.opened.length).toBeGreaterThan(3);
  expect(new Set(world.opened.slice(1))).toEqual(new Set(['eye 1']));
  const [gap] = world.reader.view().gaps;
  expect((gap?.toUtcMs ?? 0) - (gap?.fromUtcMs ?? 0)).toBeGreaterThan(9000);
  const inGap = world.samples.filter(
    ({ time_utc: time }) => Date.parse(time) > (gap?.fromUtcMs ?? 0) && Date.parse(time) < (gap?.toUtcMs ?? 0),
  );
  expect(inGap).toEqual([]);
});

test('a picture of another size or another camera than was marked is not kept', async () => {
  const world = await reading();
  world.reader.use({ ...plan, picture: { cameraId: 'eye 2', ...picture } });
  await world.watch(1);
  world.reader.use(plan);
  await world.watch(2, { size: { width: 640, height: 480 } });
  expect(world.reader.view().spot).not.toBeNull();
  expect(world.reader.view().sender.buffer).toMatchObject({ held: 0, stored: 0 });
});

test('a camera that was given up while it opened is closed', async () => {
  const world = new World();
  const opening = world.reader.openCamera(null);
  world.reader.closeCamera();
  await opening;
  expect(world.events).toBeNull();
  expect(world.reader.view().camera.kind).toBe('closed');
  world.plugged = false;
  await world.reader.openCamera('eye 2');
  expect(world.reader.view().camera).toEqual({ kind: 'refused', why: 'No camera is connected.' });
});
