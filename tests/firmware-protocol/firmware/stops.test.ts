import { sealed } from '@/scripts/soak/fuzz/almost-lines';
import { FirmwareScript } from '@/tests/support/firmware-script';

/** Stops, lease, inputs: what ends a motion, and where (SPEC 8.4, 9, 10, 11). */
const LIMITS = 'teach -20000 20000 1000000 2000000 100000';
const HOMED_MS = 14_000;

function homed(): FirmwareScript {
  const script = new FirmwareScript({ place: -20 }).wait(100).hello().order('renew').order(LIMITS).wait(200).order('home 0000AAAA');
  script.renewing(HOMED_MS - script.now);
  return script;
}

/** A long move at 1000 microsteps/s, ramps of 1 s and 500 microsteps at 1000/s²; interrupted after so many ms. */
function movingFor(ms: number): FirmwareScript {
  return homed()
    .order('renew')
    .order('move 0000AAAB 15000 1000000 1000000 now')
    .wait(ms - 20);
}

const STOPS = [
  ['hold', 'hold', 1000],
  ['stop keep', 'stop', 2000],
  ['stop free', 'stop', 2000],
] as const;

describe.each([40, 300, 700, 1000, 1500])('after %d ms of motion', (ms) => {
  test.each(STOPS)('%s brakes at the acceleration that SPEC 9 gives it and stands on a whole microstep', (word, cause, acceleration) => {
    const run = movingFor(ms)
      .raw(sealed(`q 0 00000000 0 ${word}`))
      .wait(3000)
      .order('status')
      .run();
    const { steps, net } = run.stepsAfter(HOMED_MS * 1000);
    const stopUs = (HOMED_MS + 20 + ms) * 1000;
    const speed = Math.min(1000, (1000 * ms) / 1000);
    const after = steps.filter(({ atUs }) => atUs > stopUs).length;
    // v²/2a, one step more for the one under way, one for the whole microstep.
    expect(after).toBeLessThanOrEqual((speed * speed) / (2 * acceleration) + 2);
    expect(after).toBeGreaterThanOrEqual(Math.floor((speed * speed) / (2 * acceleration)) - Math.ceil(speed / 100) - 1);
    const [ended] = run.of('ended').slice(-1);
    expect(ended).toMatchObject({ tag: '0000AAAB', position: net, cause });
    expect((ended?.atUs as number) - stopUs).toBeLessThanOrEqual((speed / acceleration) * 1.1e6 + 30_000);
    expect(run.last.body).toMatchObject({ state: 'rest', position: word === 'stop free' ? null : net });
  });

  test('off makes no further step and forgets the position', () => {
    const run = movingFor(ms).raw(sealed('q 0 00000000 0 off')).wait(1000).put('dump').order('status').run();
    const stopUs = (HOMED_MS + 20 + ms) * 1000;
    expect(run.host.steps.filter(({ atUs }) => atUs > stopUs)).toEqual([]);
    expect(run.host.dumps[0]?.driversOn).toBe(false);
    expect(run.of('ended').at(-1)).toMatchObject({ position: null, cause: 'off' });
  });

  test('loss of the supply makes no further step', () => {
    const run = movingFor(ms).input('supply', false).wait(1000).input('supply', true).wait(100).put('dump').order('status').run();
    const lostUs = (HOMED_MS + 20 + ms) * 1000;
    expect(run.host.steps.filter(({ atUs }) => atUs > lostUs)).toEqual([]);
    expect(run.host.dumps[0]?.driversOn).toBe(false);
    expect(run.last.body).toMatchObject({ state: 'rest', position: null });
  });

  test('an opening interlock brakes at the cap; its closing starts nothing', () => {
    const run = movingFor(ms).input('interlock', false).wait(1500).input('interlock', true).wait(500).order('renew').wait(2000).run();
    const openUs = (HOMED_MS + 20 + ms) * 1000;
    const speed = Math.min(1000, ms);
    expect(run.of('ended').at(-1)).toMatchObject({ cause: 'interlock' });
    const after = run.host.steps.filter(({ atUs }) => atUs > openUs);
    expect(after.length).toBeLessThanOrEqual((speed * speed) / 4000 + 2);
    expect(after.every(({ atUs }) => atUs < openUs + (speed / 2000) * 1.1e6 + 30_000)).toBe(true);
  });
});

test('no braking step is faster than the step before it', () => {
  for (const word of ['hold', 'stop keep']) {
    const run = movingFor(900)
      .raw(sealed(`q 0 00000000 0 ${word}`))
      .wait(2000)
      .run();
    const stopUs = (HOMED_MS + 920) * 1000;
    const times = run.host.steps.filter(({ atUs }) => atUs > stopUs - 5000).map(({ atUs }) => atUs);
    const intervals = times.slice(1).map((us, index) => us - (times[index] as number));
    const first = times.findIndex((us) => us > stopUs);
    for (let index = Math.max(first, 1); index < intervals.length; index += 1)
      expect(intervals[index]).toBeGreaterThanOrEqual((intervals[index - 1] as number) - 0.5);
  }
});

test('a hold that becomes a stop brakes more steeply from there on', () => {
  const holdOnly = movingFor(1500).raw(sealed('q 0 00000000 0 hold')).wait(3000).run();
  const both = movingFor(1500).raw(sealed('q 0 00000000 0 hold')).wait(200).raw(sealed('q 0 00000000 0 stop keep')).wait(3000).run();
  expect(both.of('ended').at(-1)).toMatchObject({ cause: 'stop' });
  const gain = holdOnly.host.steps.length - both.host.steps.length;
  // From 800/s: 320 steps at 1000/s², 160 at 2000/s².
  expect(gain).toBeGreaterThan(150);
  expect(gain).toBeLessThan(170);
});

test('without renewal a motion brakes 2 s after the last one was received', () => {
  const script = homed().order('renew');
  const renewedUs = (script.now - 20) * 1000;
  const run = script.order('move 0000AAAB 15000 1000000 1000000 now').wait(5000).order('status').run();
  const [lease] = run.of('lease');
  expect(lease?.atUs).toBeGreaterThanOrEqual(renewedUs + 2_000_000);
  expect(lease?.atUs).toBeLessThan(renewedUs + 2_001_000);
  const [ended] = run.of('ended').slice(-1);
  expect(ended).toMatchObject({ cause: 'lease' });
  expect((ended?.atUs as number) - (lease?.atUs as number)).toBeLessThan(1_050_000);
  expect(run.last.body).toMatchObject({ state: 'rest', position: run.stepsAfter(HOMED_MS * 1000).net });
});

describe('a waiting move is cancelled without a step', () => {
  const begin = 'move 0000AAAB 500 266666 88888 000000016.000000';
  test.each<[string, (script: FirmwareScript) => unknown, string]>([
    ['hold', (script) => script.raw(sealed('q 0 00000000 0 hold')), 'hold'],
    ['stop', (script) => script.raw(sealed('q 0 00000000 0 stop keep')), 'stop'],
    ['off', (script) => script.raw(sealed('q 0 00000000 0 off')), 'off'],
    ['interlock', (script) => script.input('interlock', false), 'interlock'],
    ['supply', (script) => script.input('supply', false), 'supply'],
    ['new session', (script) => script.hello(), 'session'],
    ['lapsed lease', (script) => script, 'lease'],
  ])('%s', (_name, interrupt, cause) => {
    const script = homed().order('renew').order(begin).wait(400);
    interrupt(script);
    const run = script.wait(4000).run();
    expect(run.stepsAfter(HOMED_MS * 1000).steps).toEqual([]);
    expect(run.of('ended').at(-1)).toMatchObject({ tag: '0000AAAB', cause });
    expect(run.of('began').filter(({ tag }) => tag === '0000AAAB')).toEqual([]);
  });

  test('a lease that lapses a tenth of a millisecond before the first step', () => {
    const run = homed().order('renew').order('move 0000AAAB 500 266666 88888 000000016.000100').wait(4000).run();
    expect(run.stepsAfter(HOMED_MS * 1000).steps).toEqual([]);
    expect(run.of('ended').at(-1)).toMatchObject({ tag: '0000AAAB', cause: 'lease' });
  });

  test.each([-40, -20, 0, 20, 60, 200])('a stop %d µs from the first step leaves count and table in step', (us) => {
    const script = homed()
      .order('renew')
      .order(begin)
      .wait(900)
      .order('renew')
      .wait(16_000 - 900 - HOMED_MS - 60 + us / 1000);
    const run = script.raw(sealed('q 0 00000000 0 stop keep')).wait(500).order('status').run();
    const { net } = run.stepsAfter(HOMED_MS * 1000);
    expect(Math.abs(net)).toBeLessThanOrEqual(1);
    expect(run.last.body).toMatchObject({ state: 'rest', position: net });
    expect(run.of('began').filter(({ tag }) => tag === '0000AAAB')).toHaveLength(net);
  });
});

test('a contact that bounces is told once each way: opening at once, closing when it has come to rest, with the time of that', () => {
  const script = new FirmwareScript().wait(100);
  const bounce = (input: 'interlock' | 'supply', on: boolean) => {
    const beganMs = script.now;
    for (let count = 0; count < 5; count += 1) script.input(input, on).wait(2).input(input, !on).wait(1);
    script.input(input, on).wait(200);
    return beganMs;
  };
  const opened = [bounce('interlock', false), bounce('supply', false)];
  const closed = [bounce('interlock', true), bounce('supply', true)];
  const told = script
    .run()
    .events.slice(1)
    .map(({ atUs, what }) => [what.word, 'closed' in what ? what.closed : 'present' in what && what.present, atUs]);
  const words = ['interlock', 'supply'];
  expect(told).toEqual([
    ...words.map((word, index) => [word, false, (opened[index] as number) * 1000]),
    ...words.map((word, index) => [word, true, ((closed[index] as number) + 15) * 1000]),
  ]);
});
