import { FirmwareScript, runAll } from '@/tests/support/firmware-script';

/** SPEC 8.6: from every place the zero is met from below, at rest, at position 0. */
const WARNING_MS = 11_000;

interface Start {
  place: number;
  play?: number;
  limits?: string;
}

function homeFrom(starts: readonly Start[]) {
  const scripts = starts.map(({ place, play = 0, limits = 'teach -1500 1500 400000 400000 200000' }) => {
    const script = new FirmwareScript({ place, play }).wait(100).hello().order('renew').order(limits).wait(200).order('home 0000AAAA');
    return script
      .renewing(WARNING_MS + 30_000)
      .put('dump')
      .order('status');
  });
  return runAll(scripts);
}

/** At the acceleration cap of 400/s² the steps at a turn are no nearer than the first interval of its ramp. */
const TURN_US = Math.sqrt(2 / 400) * 1e6;

test.each([0, 1, 5, 12])('with %d microsteps of play, from every place: the edge is the zero, met from below', (play) => {
  const places = [-1500, -700, -100, -51, -50, -49, -17, -16, -15, -2, -1, 0, 1, 2, 15, 16, 17, 49, 50, 51, 100, 700, 1480];
  for (const run of homeFrom(places.map((place) => ({ place, play })))) {
    expect(run.last.body).toMatchObject({ state: 'rest', position: 0 });
    expect(run.host.dumps[0]?.place).toBe(0);
    expect(run.of('ended').at(-1)).toMatchObject({ position: 0, cause: 'done' });
    expect(run.of('edge').at(-1)).toMatchObject({ direction: 'ccw' });
    const gaps = run.host.steps.slice(1).map(({ atUs, direction }, index) => {
      const before = run.host.steps[index] as (typeof run.host.steps)[number];
      return { us: atUs - before.atUs, turns: before.direction !== direction };
    });
    // Home speed is 200/s.
    expect(gaps.filter(({ us, turns }) => us < (turns ? TURN_US : 5000) - 0.5)).toEqual([]);
    expect(run.host.steps.at(-1)?.direction).toBe(1);
  }
});

test('an edge beyond the travel is searched in vain, and the position is unknown', () => {
  for (const run of homeFrom([1600, -1600].map((place) => ({ place, limits: 'teach -700 700 400000 400000 200000' })))) {
    expect(run.of('ended').at(-1)).toMatchObject({ position: null, cause: 'search' });
    expect(run.host.steps).toHaveLength(1401);
    expect(run.last.body).toMatchObject({ state: 'rest', position: null });
  }
});

test('homing again tells by how much the count was off', () => {
  const script = new FirmwareScript({ place: 40 })
    .wait(100)
    .hello()
    .order('renew')
    .order('teach -1500 1500 400000 400000 200000')
    .wait(200);
  script.order('home 0000AAAA').renewing(20_000).put('place 3').wait(50);
  const run = script.order('home 0000AAAB').renewing(20_000).put('dump').order('status').run();
  expect(run.of('homed').map(({ position }) => position)).toEqual([null, -3]);
  expect(run.host.dumps[0]?.place).toBe(0);
});

test('a nudge at the home speed needs the key, may leave the limits, and is exact', () => {
  const limits = 'teach -72 72 400000 400000 200000';
  const script = new FirmwareScript({ place: -70 }).wait(100).hello().order('renew').order(limits).wait(200);
  script.input('key', false).order('nudge 0000AAA1 4').input('key', true).order('nudge 0000AAA2 5').order('nudge 0000AAA3 0');
  script.order('nudge 0000AAA4 -4').renewing(WARNING_MS);
  for (const tag of ['0000AAA5', '0000AAA6']) script.order(`nudge ${tag} -4`).renewing(2000);
  const run = script.put('dump').run();
  expect(run.replies.flatMap(({ body }) => (body.word === 'no' ? [[body.code, body.detail]] : []))).toEqual([
    ['key', 0],
    ['travel', 4],
    ['travel', 4],
  ]);
  expect(run.host.dumps[0]?.place).toBe(-70 - 12);
  expect(run.of('ended').map(({ cause }) => cause)).toEqual(['done', 'done', 'done']);
});
