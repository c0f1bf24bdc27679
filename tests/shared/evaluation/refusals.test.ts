import type { BuildArchiveInput } from '@/shared/archive/build-archive';
import type { StepRow } from '@/shared/archive/run-records';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { relativeDifference } from '../../support/check-data';
import { evaluateNight, evaluateRecords } from '../../support/evaluate-night';
import { alternatingAngles, night, type NightPlan } from '../../support/night';
import { wideRig, wideSourceAngleRad, withRig } from '../../support/reference-rigs';

const trueG = 6.6743e-11;
const near = (wideSourceAngleRad * 180) / Math.PI;
const wide: NightPlan = { anglesDeg: alternatingAngles(8, near, -near), dwellS: 840 };
const codes = (result: EvaluationResult) => result.warnings.map(({ code }) => code);

describe('the channel', () => {
  const records = night(wide);
  const [deflection] = records.channels;
  const renamed = (name: string, role: 'deflection' | 'environment' = 'deflection') => ({
    ...(deflection as NonNullable<typeof deflection>),
    info: { name, quantity: 'angle', unit: 'rad', role },
  });
  const withChannels = (...channels: BuildArchiveInput['channels']) => ({ ...records, channels });

  test('is the only one that measures deflection, whatever it is called', () => {
    expect(evaluateRecords(withChannels(renamed('camera'), renamed('tilt', 'environment'))).result.G).not.toBeNull();
  });

  test('must be named where there are two, and is then not the registered one', () => {
    const two = withChannels(renamed('camera'), renamed('deflection'));
    expect(() => evaluateRecords(two)).toThrow(
      'the archive holds the deflection channels "camera", "deflection"; say which with --channel',
    );
    const protocol = { formatVersion: 1 as const, name: 'x', steps: [{ kind: 'home' as const }], evaluation: { channel: 'deflection' } };
    expect(evaluateRecords({ ...two, protocol }).result.registered).toBe(true);
    const startUtcMs = records.run.startedAtUtcMs as number;
    const exclusions = [
      { startUtcMs: startUtcMs + 3000, endUtcMs: startUtcMs + 8000, reason: 'door' },
      { startUtcMs, endUtcMs: startUtcMs + 5000, reason: 'a truck, in part at the same time' },
    ];
    const other = evaluateRecords({ ...two, protocol, exclusions }, { channel: 'camera' }).result;
    expect(other.registered).toBe(false);
    expect(other.warnings).toEqual(
      expect.arrayContaining([
        {
          code: 'not-as-registered',
          message: 'The evaluation is not the registered one: channel camera, registered deflection.',
        },
        {
          code: 'excluded-by-hand',
          message: 'Beside the registered rules the samples of 2 stretches, 8 s together, were excluded by hand (exclusions.csv).',
        },
      ]),
    );
  });

  test.each([
    [
      'that there is not',
      withChannels(renamed('camera')),
      { channel: 'laser' },
      'there is no channel "laser"; deflection channels: "camera"',
    ],
    [
      'of another role',
      withChannels(renamed('camera'), renamed('tilt', 'environment')),
      { channel: 'tilt' },
      'the channel "tilt" has the role environment',
    ],
    ['at all', withChannels(renamed('tilt', 'environment')), {}, 'no channel with the role deflection'],
  ])('one %s is refused', (...[, input, options, message]) => {
    expect(() => evaluateRecords(input, options)).toThrow(message);
  });

  test('in a unit that is no deflection, or in metres without a lever, is refused', () => {
    const volts = {
      ...(deflection as NonNullable<typeof deflection>),
      info: { name: 'deflection', quantity: 'voltage', unit: 'V', role: 'deflection' as const },
    };
    expect(() => evaluateRecords(withChannels(volts))).toThrow('the unit "V"; a deflection is in rad, urad, mrad, m or mm');
    const metres = { ...volts, info: { ...volts.info, unit: 'm' } };
    expect(() => evaluateRecords({ ...withChannels(metres), rig: withRig(wideRig(), (r) => delete r.lever) })).toThrow(
      'rig.json: the channel "deflection" is in m, so lever.distance',
    );
  });
});

describe('rigs that cannot be as they are said to be', () => {
  test('a difference that no G could make between the stations is refused', () => {
    // Supposed 1.5 degrees apart on one side, near and far pull almost alike, so the observed difference would need a huge G.
    const rig = withRig(wideRig(), (r) => {
      r.stations = { near: { value: 20, u: 0, unit: 'deg' }, far: { value: 21.5, u: 0, unit: 'deg' } };
    });
    const supposed = (row: StepRow) => ({ ...row, angleEndDeg: row.seq % 4 === 0 ? 21.5 : 20 });
    expect(() => evaluateNight(wide, {}, (records) => ({ ...records, rig, steps: records.steps.map(supposed) }))).toThrow(/^rig\.json: /);
  });

  test('a reversed scale is noticed by the sign of G', () => {
    const result = evaluateNight({ ...wide, reading: (angle) => -angle }).result;
    expect(result.G?.value).toBeLessThan(0);
    expect(codes(result)).toContain('sign');
  });

  test('a near station with the torque of far is noticed', () => {
    const rig = withRig(wideRig(), (r) => {
      r.stations = { near: { value: -near, u: 0, unit: 'deg' }, far: { value: near, u: 0, unit: 'deg' } };
    });
    const result = evaluateNight({ ...wide, rig }).result;
    expect(relativeDifference(result.G?.value ?? NaN, trueG)).toBeLessThan(1e-6);
    expect(codes(result)).toContain('near-not-positive');
  });
});
