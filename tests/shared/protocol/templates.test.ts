import { checkProtocol } from '@/shared/protocol/check';
import type { Step } from '@/shared/protocol/document';
import { templateById, templates } from '@/shared/protocol/templates';
import { planTimeline } from '@/shared/protocol/timeline';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import { rigDocumentSchema } from '@/shared/rig/document';

const make = (id: string, rig = demoRigWide) => {
  const template = templateById(id);
  if (template === undefined) throw new Error(`no template ${id}`);
  return template.make(rig);
};

test.each(templates.map((template) => [template.id, template] as const))(
  '%s can be carried out on the wide demo rig as it is',
  (_, template) => {
    expect(checkProtocol(template.make(demoRigWide), demoRigWide)).toEqual([]);
  },
);

test('all but those for a rig that turns freely can be carried out on the close rig', () => {
  const refused = templates.filter((template) => checkProtocol(template.make(demoRigNarrow), demoRigNarrow).length > 0);
  expect(refused.map(({ id }) => id)).toEqual(['four-station', 'time-of-swing']);
  expect(checkProtocol(make('four-station', demoRigNarrow), demoRigNarrow).map(({ code }) => code)).toEqual(
    expect.arrayContaining(['unknown-station']) as string[],
  );
});

test.each([
  ['proof', 1, 3],
  ['scan', 1, 4],
  ['still', 1, 4],
  ['near-far', 2, 4],
  ['shaped', 2, 4],
  ['four-station', 3, 4],
  ['afternoon', 1, 3],
])('%s holds as many ring-downs after kicks as practice wants: %d of %d periods', (id, count, periods) => {
  const { items } = planTimeline({ protocol: make(id), rig: demoRigWide, timeZone: 'UTC' }, { utcMs: 0, angleDeg: 0 });
  const lengths = items.filter(({ kind }) => kind === 'ring-down').map(({ startUtcMs, endUtcMs }) => (endUtcMs - startUtcMs) / 420_000);
  expect(lengths.map((each) => Number(each.toFixed(6)))).toEqual(Array.from({ length: count }, () => periods));
});

test('ids are unique', () => {
  expect(new Set(templates.map(({ id }) => id)).size).toBe(templates.length);
});

test('near-far-short: home, near, a kick of 2 mrad, six pairs of far and near at a beat of two periods', () => {
  const reversal = (to: string): Step[] => [
    { kind: 'swing', to },
    { kind: 'dwell', beat_periods: 2 },
  ];
  expect(make('near-far-short').steps).toEqual([
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'kick', amplitude_urad: 2000, periods: 3 },
    { kind: 'repeat', times: 6, steps: [...reversal('far'), ...reversal('near')] },
  ]);
  expect(make('near-far-short').evaluation).toEqual({ method: 'equilibrium', drift: 'aba', channel: 'deflection' });
});

test('near-far: a first pair and 16 more between two kicks, then clear, in 9 h 11', () => {
  const document = make('near-far');
  const timeline = planTimeline({ protocol: document, rig: demoRigWide, timeZone: 'UTC' }, { utcMs: 0, angleDeg: 0 });
  expect(timeline.dwells).toBe(34);
  expect(timeline.items.filter(({ kind }) => kind === 'ring-down').map(({ path }) => path)).toEqual(['9.kick', '11.kick']);
  // Practice counts a minute for homing and 22 s for each move.
  expect(Math.abs(timeline.durationS - (9 * 3600 + 11 * 60))).toBeLessThan(180);
  expect(document.atEnd).toEqual({ station: 'clear', drivers: 'keep' });
  expect(timeline.items.at(-1)?.station).toBe('clear');
});

test('four-station: 184 dwells in 23 blocks after the first pair, near and far alternating throughout', () => {
  const timeline = planTimeline({ protocol: make('four-station'), rig: demoRigWide, timeZone: 'UTC' }, { utcMs: 0, angleDeg: 0 });
  expect(timeline.dwells).toBe(2 + 184);
  const sides = timeline.items.filter(({ kind }) => kind === 'dwell').map(({ station }) => station.slice(0, 3));
  expect(sides.every((side, index) => side !== sides[index - 1])).toBe(true);
});

test('shaped: 34 dwells at the beat of the plain night; three moves and three periods where the period is not known', () => {
  const timelineOf = (rig: typeof demoRigWide) =>
    planTimeline({ protocol: make('shaped', rig), rig, timeZone: 'UTC' }, { utcMs: 0, angleDeg: 0 });
  const night = timelineOf(demoRigWide);
  expect(night.dwells).toBe(34);
  // Practice: two moves and their pause take 232 s of a beat of 840 s on a slower rig; this one turns in 6 s.
  const dwell = night.items.findLast(({ kind }) => kind === 'dwell');
  expect(((dwell?.endUtcMs ?? 0) - (dwell?.startUtcMs ?? 0)) / 1000).toBeCloseTo(840 - 217.4, 0);
  const period_s = { value: 420, u: 5, unit: 's' as const };
  const unsure = { ...demoRigWide, measured: { ...demoRigWide.measured, period_s } };
  expect(timelineOf(unsure).dwells).toBe(22);
  expect(timelineOf(unsure).items.filter(({ path }) => path === '3.swing.c')).toHaveLength(1);
  expect(checkProtocol(make('shaped', unsure), unsure)).toEqual([]);
});

test('time-of-swing: eight ring-downs of six periods, by turns in line and across', () => {
  const { items } = planTimeline({ protocol: make('time-of-swing'), rig: demoRigWide, timeZone: 'UTC' }, { utcMs: 0, angleDeg: 0 });
  const rings = items.filter(({ kind }) => kind === 'ring-down');
  expect(rings.map(({ angleToDeg }) => angleToDeg)).toEqual([0, 90, 0, 90, 0, 90, 0, 90]);
  for (const { startUtcMs, endUtcMs } of rings) expect((endUtcMs - startUtcMs) / 1000).toBeCloseTo(2520, 3);
});

test('still: an hour of settling, then 32 dwells without a motion', () => {
  const { items } = planTimeline({ protocol: make('still'), rig: demoRigWide, timeZone: 'UTC' }, { utcMs: 0, angleDeg: 0 });
  expect(items.filter(({ kind }) => kind === 'dwell')).toHaveLength(32);
  expect(items.findLastIndex(({ kind }) => kind === 'swing')).toBeLessThan(items.findIndex(({ kind }) => kind === 'dwell'));
});

test('scan: angles up and down that each rig can reach', () => {
  const anglesOf = (rig: typeof demoRigWide) =>
    make('scan', rig).steps.flatMap((step) => (step.kind === 'swing' && typeof step.to !== 'string' ? [step.to.angle_deg] : []));
  expect(anglesOf(demoRigWide)).toEqual([-70, -45, -30, -20, -10, 0, 10, 20, 30, 45, 70, 45, 30, 20, 10, 0, -10, -20, -30, -45, -70]);
  expect(anglesOf(demoRigNarrow)).toEqual([33, 40, 50, 65, 90, 115, 130, 140, 147, 140, 130, 115, 90, 65, 50, 40, 33]);
});

// The lengths of the whole scan, 5 h 41 and 4 h 45 with their calibration, leave 22 and 18 dwells of two periods: each angle twice.
test.each([
  [demoRigWide, 22],
  [demoRigNarrow, 18],
])('scan: each angle is measured once up and once down', (rig, dwells) => {
  const timeline = planTimeline({ protocol: make('scan', rig), rig, timeZone: 'UTC' }, { utcMs: 0, angleDeg: rig.motion?.homeDeg ?? 0 });
  const angles = timeline.items.filter(({ kind }) => kind === 'dwell').map(({ angleToDeg }) => angleToDeg);
  expect(angles).toHaveLength(dwells);
  for (const angle of angles) expect(angles.filter((other) => other === angle)).toHaveLength(2);
});

test('empty-control: the steps of the overnight reversals on a rig whose spheres are off', () => {
  expect(make('empty-control').steps).toEqual(make('near-far').steps);
  const rig = templateById('empty-control')?.rigFor(demoRigWide);
  expect(rig?.sources).toEqual({ ...demoRigWide.sources, shape: 'none' });
  expect(templateById('near-far')?.rigFor(demoRigWide)).toBe(demoRigWide);
});

test('a rig without a clear station ends where it stands', () => {
  const stations = Object.fromEntries(Object.entries(demoRigWide.stations).filter(([name]) => name !== 'clear'));
  expect(make('near-far', { ...demoRigWide, stations }).atEnd).toBeUndefined();
});

describe('the demo rigs', () => {
  test.each([
    ['wide', demoRigWide],
    ['close', demoRigNarrow],
  ])('%s fits the format of rig.json', (_, rig) => {
    expect(rigDocumentSchema.parse(rig)).toEqual(rig);
  });

  test('the wide one stands as the format describes the demo rig', () => {
    const angles = Object.fromEntries(Object.entries(demoRigWide.stations).map(([name, { value }]) => [name, value]));
    expect(angles).toEqual({ near: 20.18, far: -20.18, clear: 90, inline: 0, across: 90, nearBack: -159.82, farBack: 159.82 });
    expect(demoRigWide.motion).toMatchObject({ homeDeg: 0, minDeg: -175, maxDeg: 175 });
    expect(demoRigWide.motion?.keepOut ?? []).toEqual([]);
  });
});
