import * as fc from 'fast-check';
import { checkDocumentText, checkProtocol } from '@/shared/protocol/check';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';
import { documents } from './arbitraries';

const home: Step = { kind: 'home' };
const near: Step = { kind: 'swing', to: 'near' };
const far: Step = { kind: 'swing', to: 'far' };
const dwell: Step = { kind: 'dwell', for_s: 600 };
const beat: Step = { kind: 'dwell', beat_periods: 2 };
const repeat = (times: number, ...steps: Step[]): Step => ({ kind: 'repeat', times, steps });
const protocol = (steps: Step[], more: Partial<ProtocolDocument> = {}): ProtocolDocument => ({
  formatVersion: 1,
  name: 'Test',
  steps,
  ...more,
});
const check = (steps: unknown[], rig: RigDocument = demoRigWide) => checkProtocol({ formatVersion: 1, name: 'Test', steps }, rig);
const places = (steps: unknown[], rig: RigDocument = demoRigWide) => check(steps, rig).map(({ code, path }) => `${code} ${path}`);

test('a sound protocol has no findings', () => {
  expect(
    check([
      home,
      near,
      repeat(6, far, beat, near, beat),
      { kind: 'settle', for_s: 60 },
      { kind: 'wait', until: { localTime: '06:30', ifPast: 'next day' } },
    ]),
  ).toEqual([]);
});

test('protocols of built steps that stay within the limits are accepted', () => {
  fc.assert(fc.property(documents, (document) => expect(checkProtocol(document, demoRigWide)).toEqual([])));
});

describe('what does not fit the format is refused at its place', () => {
  test.each([
    ['a step kind that there is none of', [home, { kind: 'swivel' }], 'unknown-kind 2.swivel', 'Accepted are: home, swing'],
    ['a step without a kind', [home, {}], 'unknown-kind 2', 'has no kind'],
    ['a step that is no object', [home, 7], 'invalid-field 2', 'must be a JSON object'],
    [
      'a field that the step does not have',
      [home, { kind: 'dwell', for_s: 5, speed: 1 }],
      'unknown-field 2.dwell',
      'for_s, periods, beat_periods',
    ],
    ['a field of the wrong type', [home, { kind: 'dwell', for_s: '600' }], 'invalid-field 2.dwell', 'for_s is "600"'],
    ['a length that is not positive', [home, { kind: 'dwell', for_s: 0 }], 'invalid-field 2.dwell', 'above 0'],
    [
      'a dwell of no length',
      [home, { kind: 'dwell' }],
      'invalid-field 2.dwell',
      'exactly one of for_s, periods, beat_periods is needed, got none',
    ],
    ['a dwell of two lengths', [home, { kind: 'dwell', for_s: 5, periods: 2 }], 'invalid-field 2.dwell', 'got for_s and periods'],
    ['a swing to nowhere', [home, { kind: 'swing' }], 'invalid-field 2.swing', 'to is missing. It takes the name of a station'],
    ['a time that is none', [home, { kind: 'wait', until: { localTime: '25:00' } }], 'invalid-field 2.wait', 'HH:MM'],
    [
      'a repeat that is half typed',
      [home, { kind: 'repeat', times: 2 }],
      'invalid-field 2.repeat',
      'steps is missing. It takes a list of steps',
    ],
    [
      'a step inside repeats',
      [home, repeat(2, repeat(2, { kind: 'swing', to: 5 } as unknown as Step))],
      'invalid-field 2.repeat.1.repeat.1.swing',
      'name of a station',
    ],
  ])('%s', (...[, steps, place, words]) => {
    const findings = check(steps);
    expect(findings.map(({ code, path }) => `${code} ${path}`)).toContain(place);
    expect(findings.map(({ message }) => message).join('\n')).toContain(words);
  });

  test('an unknown field of the document itself', () => {
    expect(checkProtocol({ formatVersion: 1, name: 'x', steps: [home], colour: 'red' }, demoRigWide)).toEqual([
      expect.objectContaining({ code: 'unknown-field', path: null, message: expect.stringContaining('onInterruption') as string }),
    ]);
  });

  test('an unknown field inside one of its parts', () => {
    const [finding] = checkProtocol({ formatVersion: 1, name: 'x', steps: [home], atEnd: { stations: 'clear' } }, demoRigWide);
    expect(finding).toMatchObject({ code: 'unknown-field', path: 'atEnd' });
    expect(finding?.message).toContain('Accepted are: station, drivers.');
    const [inUntil] = check([home, { kind: 'repeat', until: { localTime: '06:30', ifPast: 'hold' }, steps: [dwell] }]);
    expect(inUntil).toMatchObject({ code: 'unknown-field', path: '2.repeat' });
    expect(inUntil?.message).toContain('Accepted are: localTime or relativeStatisticalU.');
  });

  test('another format version', () => {
    expect(checkProtocol({ formatVersion: 2, name: 'x', steps: [home] }, demoRigWide)).toEqual([
      expect.objectContaining({ code: 'invalid-field', path: 'formatVersion' }),
    ]);
  });
});

describe('half-typed documents give findings, never exceptions', () => {
  test.each([[null], [undefined], [7], ['text'], [[]], [{}], [{ steps: null }], [{ formatVersion: 1, name: '', steps: [null, [], 'x'] }]])(
    '%j',
    (value) => {
      expect(checkProtocol(value, demoRigWide).length).toBeGreaterThan(0);
    },
  );

  test('anything at all', () => {
    fc.assert(
      fc.property(fc.anything(), fc.array(fc.anything(), { maxLength: 4 }), (value, steps) => {
        expect(Array.isArray(checkProtocol(value, demoRigWide))).toBe(true);
        expect(Array.isArray(checkProtocol({ formatVersion: 1, name: 'x', steps }, demoRigWide))).toBe(true);
      }),
    );
  });

  test('nested a hundred thousand deep', () => {
    let step: Step = dwell;
    for (let depth = 0; depth < 100_000; depth += 1) step = { kind: 'repeat', times: 1, steps: [step] };
    expect(checkProtocol(protocol([step]), demoRigWide)).toEqual([expect.objectContaining({ code: 'nested-too-deep' })]);
  });

  test('no steps, and a repeat without steps', () => {
    expect(places([])).toEqual(['no-steps null']);
    expect(places([home, repeat(2)])).toEqual(['no-steps 2.repeat']);
  });
});

describe('repeats', () => {
  const nested = (depth: number): Step => (depth === 0 ? dwell : repeat(1, nested(depth - 1)));

  test('nest four deep, not five', () => {
    expect(places([home, nested(4)])).toEqual([]);
    expect(places([home, nested(5)])).toEqual(['nested-too-deep 2.repeat.1.repeat.1.repeat.1.repeat.1.repeat']);
  });

  test('execute 10,000 steps, not one more', () => {
    expect(places([home, repeat(99, repeat(101, dwell))])).toEqual([]);
    expect(places([repeat(10_000, dwell)])).toEqual([]);
    const [finding] = check([home, repeat(10_000, dwell)]);
    expect(finding).toMatchObject({ code: 'too-many-steps', path: '2.repeat' });
    expect(finding?.message).toContain('10,001');
    expect(places([home, repeat(1_000_000, repeat(1_000_000, repeat(1_000_000, dwell)))])).toContain('too-many-steps 2.repeat');
  });

  test('the last move counts as a step', () => {
    const atEnd = { station: 'clear' };
    expect(checkProtocol(protocol([home, repeat(9_998, dwell)], { atEnd }), demoRigWide)).toEqual([]);
    expect(checkProtocol(protocol([home, repeat(9_999, dwell)], { atEnd }), demoRigWide)).toEqual([
      expect.objectContaining({ code: 'too-many-steps', path: '2.repeat' }),
    ]);
  });

  const until = (...steps: Step[]): Step => ({ kind: 'repeat', until: { localTime: '06:30' }, steps });
  const brief: Step = { kind: 'dwell', for_s: 3 };

  test('until a local time must take time in each pass', () => {
    expect(places([home, until(near)])).toEqual(['endless-repeat 2.repeat']);
    expect(places([home, until({ kind: 'mark', label: 'x' }, repeat(3, near))])).toEqual(['endless-repeat 2.repeat']);
    for (const steps of [[near, far], [brief], [home], [near, beat, far, beat], [repeat(2, near, far)]])
      expect(places([home, until(...steps)])).toEqual([]);
  });

  test('until a local time: whether the passes stay within 10,000 steps is known when the start is', () => {
    const document = protocol([home, until(brief)]);
    const at = (hour: number, minute: number, timeZone = 'UTC') =>
      checkProtocol(document, demoRigWide, { angleDeg: 0, utcMs: Date.UTC(2031, 0, 10, hour, minute), timeZone });
    expect(at(6, 0)).toEqual([]);
    expect(at(6, 31)).toEqual([expect.objectContaining({ code: 'too-many-steps', path: '2.repeat' })]);
    expect(at(5, 0, 'Europe/Oslo')).toEqual([]);
    expect(checkProtocol(document, demoRigWide, { angleDeg: 0 })).toEqual([]);
  });

  test('what is bounded by atMost counts as far as that', () => {
    expect(places([home, { ...repeat(20_000, dwell), atMost: 9_999 } as Step])).toEqual([]);
  });

  test('fields that do nothing beside the others are allowed', () => {
    expect(
      places([
        home,
        { kind: 'repeat', times: 2, atLeast: 1, atMost: 5, steps: [dwell] },
        { kind: 'settle', for_s: 5, atMost_s: 9, otherwise: 'stop' },
        { kind: 'wait', until: { localTime: '06:30' }, atMost_s: 60, otherwise: 'stop' },
      ]),
    ).toEqual([]);
  });

  test('a protocol of more than a year is refused, before its end is no date any more', () => {
    expect(places([home, { kind: 'dwell', for_s: 1e300 }])).toEqual(['too-long 2.dwell']);
    expect(places([home, repeat(9_000, { kind: 'dwell', for_s: 3600 })])).toEqual(['too-long 2.repeat']);
    expect(places([home, { kind: 'swing', to: 'near', speed_deg_s: 1e-7 }])).toEqual(['too-long 2.swing']);
    expect(places([home, repeat(8_000, { kind: 'dwell', for_s: 3600 })])).toEqual([]);
  });
});

describe('all of the format is carried out', () => {
  test('also what is seldom asked for', () => {
    expect(
      checkProtocol(
        protocol(
          [
            home,
            near,
            { kind: 'swing', to: 'far', profile: 'plain' },
            { kind: 'mark', label: 'x', frame: true },
            dwell,
            { kind: 'swing', to: 'near' },
            dwell,
            { kind: 'proof', size: 0.1, edge_deg: null, otherwise: 'continue' },
            { kind: 'settle', calmWhen: { amplitude_urad: 50, window_s: 900 }, atMost_s: 3600, otherwise: 'stop' },
            { kind: 'wait', until: { channel: 'box temperature', below: 21, for_s: 120 }, otherwise: 'continue' },
            { kind: 'prompt', text: 'Hands clear', atMost_s: 600, otherwise: 'stop' },
            { kind: 'repeat', times: 1, counting: 'all', order: 'as written', steps: [dwell] },
            { kind: 'repeat', times: 2, counting: 'good', atMost: 5, steps: [dwell] },
            { kind: 'repeat', until: { relativeStatisticalU: 0.001 }, atMost: 50, steps: [dwell] },
          ],
          {
            onInterruption: 'resume',
            goodWhen: { residual_urad: 40, channels: [{ channel: 'box temperature', slopeBelow_per_h: 0.3 }] },
            atEnd: { station: 'clear', drivers: 'release' },
            evaluation: { method: 'equilibrium', drift: 'aba', order: 2, channel: 'deflection' },
          },
        ),
        demoRigWide,
      ),
    ).toEqual([]);
  });

  test('a required bound is asked for', () => {
    expect(places([home, { kind: 'repeat', until: { relativeStatisticalU: 0.001 }, steps: [dwell] }])).toEqual(['field-missing 2.repeat']);
    expect(places([home, { kind: 'repeat', times: 3, counting: 'good', steps: [dwell] }])).toEqual(['field-missing 2.repeat']);
  });

  test.each<[string, unknown[], string]>([
    [
      'fewer passes at most than are asked for',
      [{ kind: 'repeat', times: 8, counting: 'good', atMost: 7, steps: [dwell] }],
      'bounds-crossed 2.repeat',
    ],
    [
      'a wait that gives up before it can be met',
      [{ kind: 'wait', until: { channel: 'tilt', below: 1, for_s: 600 }, atMost_s: 599 }],
      'never-met 2.wait',
    ],
    [
      'a window too short to tell swing from drift',
      [{ kind: 'settle', calmWhen: { drift_urad_per_h: 100, window_s: 167 } }],
      'window-short 2.settle',
    ],
    ['a proof after dwells on one side only', [near, dwell, { kind: 'proof' }], 'proof-needs-pair 4.proof'],
    [
      'a proof that comes before its pair in the first pass',
      [{ kind: 'repeat', times: 2, steps: [near, dwell, { kind: 'proof' }, { kind: 'swing', to: 'far' }, dwell] }],
      'proof-needs-pair 2.repeat.3.proof',
    ],
  ])('%s is refused', (_, steps, place) => {
    expect(places([home, ...steps])).toEqual([place]);
  });
});

describe('texts of files', () => {
  test('what is no JSON is shown by line and column', () => {
    const { document, findings } = checkDocumentText('{\n  "formatVersion": 1,\n  "name": "x",\n  "steps": [ {"kind": "home"}, ]\n}');
    expect(document).toBeNull();
    expect(findings).toEqual([{ code: 'not-json', path: null, message: expect.stringMatching(/^Line 4, column 32: /) as string }]);
  });

  test('a good text gives the document, with a byte order mark or without', () => {
    const text = JSON.stringify(protocol([home]));
    expect(checkDocumentText(text)).toEqual({ document: protocol([home]), findings: [] });
    expect(checkDocumentText(`\uFEFF${text}`).document).toEqual(protocol([home]));
  });

  test('JSON that is no protocol gives the places', () => {
    expect(checkDocumentText('[]').findings).toEqual([expect.objectContaining({ code: 'invalid-field', path: null })]);
  });
});
