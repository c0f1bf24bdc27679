import * as fc from 'fast-check';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { dwellEndUtcMs, homeDurationS, swingMove, UnplayableStep } from '@/shared/protocol/durations';
import { templateById } from '@/shared/protocol/templates';
import { planTimeline } from '@/shared/protocol/timeline';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';
import { steps } from './arbitraries';

const start = { utcMs: Date.UTC(2031, 2, 13, 21), angleDeg: 0 };
const timelineOf = (protocol: Pick<ProtocolDocument, 'steps' | 'atEnd'>, rig: RigDocument = demoRigWide) =>
  planTimeline({ protocol, rig, timeZone: 'UTC' }, { utcMs: start.utcMs, angleDeg: rig.motion?.homeDeg ?? 0 });

/** Distance over speed plus speed over acceleration, or twice the root of distance over acceleration: textbook kinematics at 6 deg/s, 2 deg/s2. */
const moveS = (distanceDeg: number) => (distanceDeg >= 18 ? distanceDeg / 6 + 3 : 2 * Math.sqrt(distanceDeg / 2));

describe('moves', () => {
  // Values of the design reference, section K2 (verified there by an independent implementation): v = 6 deg/s, a = 2 deg/s2.
  test.each([
    [114.76151385761, 22.12691897627],
    [40.361656773404, 9.726942795567],
    [18, 6],
    [10, 4.472135955],
  ])('a move over %p deg takes %p s', (distanceDeg, seconds) => {
    expect(swingMove({ to: { angle_deg: distanceDeg } }, demoRigWide, 0).durationS).toBeCloseTo(seconds, 8);
  });

  test('a step has its own speed and acceleration: 90 deg at 10 deg/s and 5 deg/s2 take 11 s', () => {
    expect(swingMove({ to: 'clear', speed_deg_s: 10, acceleration_deg_s2: 5 }, demoRigWide, 0).durationS).toBeCloseTo(11, 12);
  });

  test('names the station it goes to, also when only the angle is given', () => {
    expect(swingMove({ to: 'across' }, demoRigWide, 0)).toMatchObject({ targetDeg: 90, station: 'across' });
    expect(swingMove({ to: { angle_deg: -20.18 } }, demoRigWide, 0)).toMatchObject({ station: 'far' });
    expect(swingMove({ to: { angle_deg: 33 } }, demoRigWide, 0)).toMatchObject({ station: '' });
  });

  test('an unknown station, or a rig without motion, is an error with its code', () => {
    expect(() => swingMove({ to: 'nowhere' }, demoRigWide, 0)).toThrow(
      expect.objectContaining({ code: 'unknown-station' }) as UnplayableStep,
    );
    expect(() => swingMove({ to: 'near' }, { ...demoRigWide, motion: undefined }, 0)).toThrow(
      expect.objectContaining({ code: 'motion-missing' }) as UnplayableStep,
    );
  });
});

test('homing takes the way to the edge at home speed and a little to settle on it', () => {
  // 90 deg at 0.6 deg/s are 150 s; braking, clearance and return are under 3 s.
  expect(homeDurationS(demoRigWide, 90)).toBeGreaterThan(150);
  expect(homeDurationS(demoRigWide, 90)).toBeLessThan(153);
  expect(homeDurationS(demoRigWide, -90)).toBeGreaterThan(150);
  expect(homeDurationS(demoRigWide, -90)).toBeLessThan(153);
  expect(homeDurationS(demoRigWide, 0)).toBeLessThan(2);
});

describe('lengths of a dwell', () => {
  const begin = { startUtcMs: 10_000, swingStartUtcMs: 4_000 };
  const unmeasured = { ...demoRigWide, measured: undefined };

  test('in seconds, in periods from its own start, in periods from the start of the swing', () => {
    expect(dwellEndUtcMs({ kind: 'dwell', for_s: 600 }, demoRigWide, begin)).toBe(610_000);
    expect(dwellEndUtcMs({ kind: 'dwell', periods: 1.5 }, demoRigWide, begin)).toBe(640_000);
    expect(dwellEndUtcMs({ kind: 'dwell', beat_periods: 2 }, demoRigWide, begin)).toBe(844_000);
  });

  test('periods need a measured one, a beat needs a swing', () => {
    expect(() => dwellEndUtcMs({ kind: 'dwell', periods: 2 }, unmeasured, begin)).toThrow('measured.period_s');
    expect(() => dwellEndUtcMs({ kind: 'dwell', beat_periods: 2 }, demoRigWide, { ...begin, swingStartUtcMs: null })).toThrow(
      'directly follow a swing',
    );
  });
});

describe('a known protocol', () => {
  const timeline = timelineOf({
    steps: [
      { kind: 'home' },
      { kind: 'swing', to: 'near' },
      { kind: 'mark', label: 'begin' },
      {
        kind: 'repeat',
        times: 2,
        steps: [
          { kind: 'swing', to: 'far' },
          { kind: 'dwell', beat_periods: 2 },
          { kind: 'swing', to: 'near' },
          { kind: 'dwell', for_s: 600 },
        ],
      },
      { kind: 'settle', for_s: 300 },
    ],
    atEnd: { station: 'clear', drivers: 'keep' },
  });

  test('lasts as long as the sum by hand', () => {
    const home = homeDurationS(demoRigWide, 0);
    const byHand = home + moveS(20.18) + 2 * (840 + moveS(40.36) + 600) + 300 + moveS(69.82);
    expect(timeline.durationS).toBeCloseTo(byHand, 6);
    expect(timeline.endUtcMs - timeline.startUtcMs).toBeCloseTo(byHand * 1000, 3);
  });

  test('follows without a gap, knows where the sources stand, and counts dwells', () => {
    for (const [index, item] of timeline.items.entries()) {
      expect(item.startUtcMs).toBe(index === 0 ? start.utcMs : timeline.items[index - 1]?.endUtcMs);
      expect(item.angleFromDeg).toBe(index === 0 ? 0 : timeline.items[index - 1]?.angleToDeg);
    }
    expect(timeline.dwells).toBe(4);
    expect(timeline.items.map(({ kind, station }) => `${kind} ${station}`).slice(0, 7)).toEqual([
      'home inline',
      'swing near',
      'mark near',
      'swing far',
      'dwell far',
      'swing near',
      'dwell near',
    ]);
    expect(timeline.items.at(-1)).toMatchObject({ path: 'atEnd.swing', station: 'clear', angleToDeg: 90 });
  });

  test('a beat of two periods ends 840 s after its swing began, however long the swing took', () => {
    const swings = timelineOf(templateById('near-far-short')?.make(demoRigWide) as ProtocolDocument).items.filter(
      ({ kind }) => kind === 'swing',
    );
    // The first swing has no dwell after it; from the second on they come at the beat.
    for (let index = 2; index < swings.length; index += 1) {
      expect(((swings[index]?.startUtcMs ?? 0) - (swings[index - 1]?.startUtcMs ?? 0)) / 1000).toBeCloseTo(840, 6);
    }
  });
});

describe('lengths that people who run such rigs plan with', () => {
  // Swing 22 s and dwell 818 s on the close rig, 10 s and 830 s on the wide one, at a beat of 2 T = 840 s; a turn by 180 deg takes 33 s (common practice, no source).
  const overnight = (rig: RigDocument) => timelineOf(templateById('near-far')?.make(rig) as ProtocolDocument, rig).items;
  const last = (items: ReturnType<typeof overnight>, kind: string, to: string) => {
    const item = items.filter((each) => each.kind === kind && each.station === to).at(-1);
    return ((item?.endUtcMs ?? 0) - (item?.startUtcMs ?? 0)) / 1000;
  };

  test('close rig', () => {
    expect(last(overnight(demoRigNarrow), 'swing', 'near')).toBeCloseTo(22.1, 1);
    expect(last(overnight(demoRigNarrow), 'dwell', 'near')).toBeCloseTo(817.9, 1);
  });

  test('wide rig', () => {
    expect(last(overnight(demoRigWide), 'swing', 'far')).toBeCloseTo(9.7, 1);
    expect(last(overnight(demoRigWide), 'dwell', 'far')).toBeCloseTo(830.3, 1);
  });

  test('four stations: the turn takes 33 s and 807 s of the beat are left', () => {
    const items = timelineOf(templateById('four-station')?.make(demoRigWide) as ProtocolDocument).items;
    const turn = items.find((item) => item.kind === 'swing' && item.station === 'nearBack' && item.angleFromDeg === 20.18);
    const rest = items.find(({ kind, station }) => kind === 'settle' && station === 'nearBack');
    expect(((turn?.endUtcMs ?? 0) - (turn?.startUtcMs ?? 0)) / 1000).toBeCloseTo(33, 6);
    expect(((rest?.endUtcMs ?? 0) - (rest?.startUtcMs ?? 0)) / 1000).toBeCloseTo(807, 6);
  });
});

/** Sum of the lengths of steps by hand, following the angle. */
function byHand(list: readonly Step[], from: number): { seconds: number; angle: number } {
  let [seconds, angle] = [0, from];
  for (const step of list) {
    if (step.kind === 'swing') {
      const to = typeof step.to === 'string' ? (demoRigWide.stations[step.to]?.value ?? 0) : step.to.angle_deg;
      seconds += moveS(Math.abs(to - angle));
      angle = to;
    } else if (step.kind === 'dwell') seconds += step.for_s ?? 420 * (step.periods ?? 0);
    // Of what ends by a condition the least is planned: the time for which it has to hold.
    else if (step.kind === 'settle') seconds += step.for_s ?? step.calmWhen?.window_s ?? 0;
    else if (step.kind === 'wait' && 'channel' in step.until) seconds += step.until.for_s ?? 60;
    else if (step.kind === 'repeat') {
      for (let pass = 0; pass < (step.times ?? 0); pass += 1) {
        const inner = byHand(step.steps, angle);
        [seconds, angle] = [seconds + inner.seconds, inner.angle];
      }
    }
  }
  return { seconds, angle };
}

test('any protocol lasts as long as its steps together', () => {
  fc.assert(
    fc.property(steps, (list) => {
      const expected = byHand(list, 0);
      const timeline = timelineOf({ steps: list });
      expect(timeline.durationS).toBeCloseTo(expected.seconds, 4);
      expect(timeline.items.at(-1)?.angleToDeg ?? 0).toBe(expected.angle);
    }),
  );
});

describe('drafts', () => {
  test('steps that cannot be carried out take no time', () => {
    const timeline = timelineOf({
      steps: [
        { kind: 'swing', to: 'nowhere' },
        { kind: 'dwell', for_s: 60 },
        { kind: 'kick', amplitude_urad: 2e6 },
        { kind: 'prompt', text: 'x' },
      ],
    });
    expect(timeline.items.map(({ startUtcMs, endUtcMs }) => endUtcMs - startUtcMs)).toEqual([0, 60_000, 0, 0]);
  });

  test('an empty protocol lasts no time', () => {
    expect(timelineOf({ steps: [] })).toMatchObject({ items: [], durationS: 0, dwells: 0, truncated: false });
  });

  test('a plan without an end is cut off and says so', () => {
    const endless = timelineOf({ steps: [{ kind: 'repeat', until: { localTime: '06:30' }, steps: [{ kind: 'mark', label: 'x' }] }] });
    expect(endless.truncated).toBe(true);
  });
});

test('a night until 06:30 ends on a whole pass by 06:30', () => {
  const timeline = planTimeline(
    {
      protocol: {
        steps: [
          { kind: 'home' },
          { kind: 'swing', to: 'near' },
          {
            kind: 'repeat',
            until: { localTime: '06:30' },
            steps: [
              { kind: 'swing', to: 'far' },
              { kind: 'dwell', beat_periods: 2 },
              { kind: 'swing', to: 'near' },
              { kind: 'dwell', beat_periods: 2 },
            ],
          },
        ],
      },
      rig: demoRigWide,
      timeZone: 'Europe/Oslo',
    },
    { utcMs: Date.parse('2031-03-29T21:00:00Z'), angleDeg: 0 },
  );
  // Summer time begins that night: from 22:00 to 06:30 there are 7 h 30 min, 27,000 s less homing and the first swing, so 16 passes of 1680 s.
  expect(timeline.dwells).toBe(32);
  expect(timeline.endUtcMs).toBeLessThanOrEqual(Date.parse('2031-03-30T04:30:00Z'));
  expect(timeline.endUtcMs).toBeGreaterThan(Date.parse('2031-03-30T04:30:00Z') - 1680_000);
});
