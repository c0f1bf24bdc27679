import { dwellWords, sourceLines, strategyLines } from '@/components/protocols/night-words';
import { makeMiniature, makePlan } from '@/components/protocols/plan';
import { differenceWords } from '@/components/protocols/difference-words';
import { stepTitle, stepUnder } from '@/components/protocols/step-words';
import { compareDocuments } from '@/shared/protocol/compare';
import { forecastNight, type NightForecast } from '@/shared/planning/night-forecast';
import { cadenceOf } from '@/shared/planning/strategies';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';

const pair: Step[] = [
  { kind: 'swing', to: 'far' },
  { kind: 'dwell', beat_periods: 2 },
  { kind: 'swing', to: 'near' },
  { kind: 'dwell', beat_periods: 2 },
];
const document: ProtocolDocument = {
  formatVersion: 1,
  name: 'Six pairs',
  steps: [{ kind: 'home' }, { kind: 'swing', to: 'near' }, { kind: 'repeat', times: 6, steps: pair }],
};
const startUtcMs = Date.UTC(2031, 2, 14, 21, 0);
const at = { rig: demoRigWide, timeZone: 'Europe/Oslo', startUtcMs };

test('each step has the length it has by plan, a repeat all its passes', () => {
  const { spans } = makePlan({ document, ...at });
  // Beat of 2 periods of 420 s: 840 s from swing to swing, six pairs of two.
  expect(spans.get('3.repeat')?.durationS).toBeCloseTo(12 * 840, 6);
  const swing = spans.get('3.repeat.1.swing');
  const dwell = spans.get('3.repeat.2.dwell');
  expect((swing?.durationS ?? 0) + (dwell?.durationS ?? 0)).toBeCloseTo(840, 6);
  expect(dwell).toMatchObject({ count: 6, station: 'far', firstKey: '3.repeat[1].2.dwell' });
});

test('the strip, the prediction and the signal are there for the whole length', () => {
  const plan = makePlan({ document, ...at });
  expect(plan.timeline.dwells).toBe(12);
  expect(plan.predicted?.x[0]).toBe(startUtcMs);
  expect(plan.predicted?.x.at(-1)).toBeCloseTo(plan.timeline.endUtcMs, 3);
  expect(plan.signal?.signalRad).toBeGreaterThan(0);
  expect(plan.findings).toEqual([]);
});

test('a draft that cannot run is shown with its findings instead of failing', () => {
  const broken: ProtocolDocument = {
    ...document,
    steps: [
      { kind: 'swing', to: 'atlantis' },
      { kind: 'repeat', times: 2, steps: [] },
    ],
  };
  const plan = makePlan({ document: broken, ...at });
  expect(plan.findings.map(({ path }) => path)).toEqual(expect.arrayContaining(['1.swing', '2.repeat']));
});

test('what the night gives: u of G by source with the greatest first, what the dwells leave open, and the same hours otherwise', () => {
  const { timeline } = makePlan({ document, ...at });
  const cadence = cadenceOf(timeline, demoRigWide) as NightForecast['cadence'];
  const forecast = forecastNight(demoRigWide, cadence, timeline.durationS) as NightForecast;
  const [first, second] = sourceLines(forecast, 2);
  // The orbit of the sources leaves 0.38 % of G open on the wide rig, the arm 0.11 % (physics.md F4).
  expect(first).toMatchObject({ name: 'orbit of the sources', u: '0.38\u202f%' });
  expect(second).toMatchObject({ name: 'arm of the pendulum', u: '0.11\u202f%' });
  expect(dwellWords(forecast)).toMatch(
    /^The dwells leave 0\.\d+\u202f% of G open, of it .* for the wandering of the zero\. From \d+ pairs? on/,
  );
  const lines = strategyLines(forecast);
  expect(lines.filter(({ best }) => best)).toHaveLength(1);
  expect(lines.at(-1)?.under).toMatch(/1 pair|2 pairs|3 pairs/);
});

test('a miniature is drawn from the same plan with fewer points', () => {
  const mini = makeMiniature({ document, ...at });
  expect(mini.timeline.durationS).toBe(makePlan({ document, ...at }).timeline.durationS);
  expect(mini.predicted?.x.length).toBeLessThan(400);
});

const reads: readonly { step: Step; durationS: number | null; title: string; under: string }[] = [
  { step: { kind: 'swing', to: 'near' }, durationS: 10, title: 'Swing to near', under: 'plain · 10\u202fs' },
  { step: { kind: 'swing', to: { angle_deg: -12.5 } }, durationS: null, title: 'Swing to −12.50°', under: 'plain' },
  { step: { kind: 'dwell', beat_periods: 2 }, durationS: 830, title: 'Dwell', under: 'beat of 2 T · 13\u202fmin 50\u202fs' },
  { step: { kind: 'dwell', periods: 1.5 }, durationS: null, title: 'Dwell', under: '1.5 T' },
  { step: { kind: 'repeat', times: 16, steps: pair }, durationS: null, title: 'Repeat 16 times', under: '' },
  { step: { kind: 'repeat', times: 3, order: 'shuffled', steps: pair }, durationS: null, title: 'Repeat 3 times, shuffled', under: '' },
  { step: { kind: 'repeat', until: { localTime: '06:30' }, steps: pair }, durationS: null, title: 'Repeat until 06:30', under: '' },
  {
    step: { kind: 'wait', until: { localTime: '22:00', ifPast: 'hold' } },
    durationS: null,
    title: 'Wait until 22:00',
    under: 'hold if past',
  },
  { step: { kind: 'mark', label: 'lights off' }, durationS: 0, title: 'Mark “lights off”', under: '' },
  { step: { kind: 'settle', for_s: 600, label: 'creep' }, durationS: 600, title: 'Settle', under: '10\u202fmin · “creep”' },
];

test.each(reads)('$title reads as people would say it', ({ step, durationS, title, under }) => {
  expect(stepTitle(step)).toBe(title);
  expect(stepUnder(step, durationS)).toBe(under);
});

test('differences are said with their step, before and after', () => {
  const longer: ProtocolDocument = {
    ...document,
    onInterruption: 'resume',
    steps: [{ kind: 'home' }, { kind: 'settle', for_s: 600 }, { kind: 'swing', to: 'near' }, { kind: 'repeat', times: 8, steps: pair }],
  };
  expect(compareDocuments(document, longer).map(differenceWords)).toEqual([
    { mark: 'added', where: 'After an interruption', before: 'not given', after: 'resume' },
    { mark: 'added', where: 'Step 2', before: '', after: 'Settle' },
    { mark: 'changed', where: 'Step 4, repeat: times', before: '6', after: '8' },
  ]);
});
