import { adviseProtocol } from '@/shared/protocol/advise';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { templates } from '@/shared/protocol/templates';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';

const T = 420;
const swing = (to: string): Step => ({ kind: 'swing', to });
const dwell = (for_s: number): Step => ({ kind: 'dwell', for_s });
const beat = (beat_periods: number): Step => ({ kind: 'dwell', beat_periods });
const document = (steps: Step[]): ProtocolDocument => ({ formatVersion: 1, name: 'Test', steps });
const advice = (steps: Step[], rig: RigDocument = demoRigWide) =>
  adviseProtocol(document([{ kind: 'home' }, swing('near'), ...steps]), rig, { utcMs: 0, angleDeg: rig.motion?.homeDeg ?? 0 });
const codes = (steps: Step[], rig?: RigDocument) => advice(steps, rig).map(({ code, path }) => `${code} ${path}`);
const pumping = (steps: Step[]) => codes(steps).filter((code) => code.startsWith('cycle-pumps'));
const pairs = (step: Step): Step[] => [{ kind: 'repeat', times: 6, steps: [swing('far'), step, swing('near'), step] }];

describe('cycle-pumps', () => {
  // Design reference J2: at 1.5 T the ringing grows to 2.24 times a swing's, at 2 T and 1 T it stays below.
  test.each([1.31, 1.4, 1.5, 1.6, 1.69, 2.31, 2.5, 2.69, 3.5])('a beat of %p periods pumps', (periods) => {
    expect(pumping(pairs(beat(periods)))).toEqual(['cycle-pumps 3.repeat.2.dwell', 'cycle-pumps 3.repeat.4.dwell']);
  });

  test.each([1.28, 1.29, 1.71, 2, 2.29, 2.71, 3])('a beat of %p periods does not', (periods) => {
    expect(pumping(pairs(beat(periods)))).toEqual([]);
  });

  test('the swing counts: a dwell of 620 s after a swing of 9.7 s is a beat of 1.5 periods', () => {
    const [finding] = advice(pairs(dwell(620)));
    expect(finding).toMatchObject({ code: 'cycle-pumps', path: '3.repeat.2.dwell' });
    expect(finding?.message).toContain('630 s, 1.50 periods');
    expect(finding?.message).toContain('830.3 s');
    expect(finding?.message).toContain('beat_periods 2');
  });

  test('waiting without evaluating counts as standing still, a wait for a time of day is not foreseen', () => {
    expect(
      codes([swing('far'), { kind: 'settle', for_s: 300 }, dwell(320), swing('near'), dwell(830), swing('far'), dwell(830)]),
    ).toContain('cycle-pumps 5.dwell');
    expect(
      codes([
        swing('far'),
        dwell(830),
        swing('near'),
        { kind: 'wait', until: { localTime: '06:30' } },
        dwell(830),
        swing('far'),
        dwell(830),
      ]),
    ).toEqual([]);
  });

  test('a dwell that no swing follows pumps nothing, nor does the last move to clear', () => {
    expect(
      codes([swing('far'), dwell(830), swing('near'), dwell(830), swing('far'), dwell(620)]).filter((code) =>
        code.startsWith('cycle-pumps'),
      ),
    ).toEqual([]);
    const ending = {
      ...document([{ kind: 'home' }, swing('near'), swing('far'), dwell(830), swing('near'), dwell(830), swing('far'), dwell(620)]),
      atEnd: { station: 'clear' },
    };
    expect(adviseProtocol(ending, demoRigWide, { utcMs: 0, angleDeg: 0 }).filter(({ code }) => code === 'cycle-pumps')).toEqual([]);
  });

  test('after so long that the ringing is gone nothing is pumped', () => {
    // Q = 8: after 9.5 periods exp(−9.5 × 0.3935) = 2.4 % is left (log decrement of design reference A8).
    expect(codes(pairs(beat(9.5)))).toEqual([]);
    expect(codes(pairs(beat(5.5)))).toHaveLength(2);
  });
});

describe('dwell-short', () => {
  test('under 1.25 periods the centre cannot be told from the swinging', () => {
    const [finding] = advice(pairs(beat(1)));
    expect(finding).toMatchObject({ code: 'dwell-short', path: '3.repeat.2.dwell' });
    expect(finding?.message).toContain('410 s, 0.98 periods');
    expect(finding?.message).toContain('525 s');
  });

  test('a ring-down in the protocol lets 0.9 periods do', () => {
    const kick: Step = { kind: 'kick', amplitude_urad: 2000 };
    expect(codes([kick, ...pairs(beat(1))])).toEqual([]);
    expect(codes([kick, swing('far'), dwell(0.89 * T), swing('near'), dwell(2 * T), swing('far'), dwell(2 * T)])).toContain(
      'dwell-short 5.dwell',
    );
  });

  test('exactly 1.25 periods are enough', () => {
    expect(
      codes([swing('far'), dwell(525), swing('near'), dwell(525), swing('far'), dwell(525)]).filter((code) =>
        code.startsWith('dwell-short'),
      ),
    ).toEqual([]);
  });
});

describe('no-ring-down', () => {
  test('dwells of one and a quarter periods lose a fifth of their u: √(1.5622/1.0698) in the table of C4', () => {
    const [finding] = advice(pairs(dwell(1.25 * T))).filter(({ code }) => code === 'no-ring-down');
    expect(finding?.message).toContain('dwells of 1.25 periods alone, which makes the uncertainty of each 1.21 times');
  });

  test('with a kick, at two periods, or on one side only there is nothing to say', () => {
    expect(codes([{ kind: 'kick', amplitude_urad: 2000 }, ...pairs(beat(1))])).toEqual([]);
    expect(codes(pairs(beat(2)))).toEqual([]);
    expect(codes([dwell(525), dwell(525)])).not.toContain('no-ring-down null');
  });
});

test('a repeat that ends by the u it has reached: u of 20 passes is known to 16 % (GUM, table E.1)', () => {
  const until = (atLeast?: number): Step[] => [
    {
      kind: 'repeat',
      until: { relativeStatisticalU: 0.001 },
      atMost: 90,
      ...(atLeast === undefined ? {} : { atLeast }),
      steps: [swing('far'), beat(2), swing('near'), beat(2)],
    },
  ];
  const messageOf = (atLeast?: number) => advice(until(atLeast)).find(({ code }) => code === 'optional-stopping')?.message;
  expect(messageOf()).toContain('comes down to 0.10 %, looked at from 20 passes on, where u itself is known to 16 % only');
  expect(messageOf(50)).toContain('from 50 passes on, where u itself is known to 10 % only');
});

describe('u-not-planned', () => {
  const rotation: Step = { kind: 'rotate', period_s: 900, turns: 10 };
  const found = (steps: Step[], method?: 'equilibrium' | 'period' | 'acceleration' | 'modulation') =>
    adviseProtocol({ ...document(steps), ...(method === undefined ? {} : { evaluation: { method } }) }, demoRigWide, {
      utcMs: 0,
      angleDeg: 0,
    })
      .filter(({ code }) => code === 'u-not-planned')
      .map(({ path, message }) => `${path}: ${message}`);

  test('a rotation says that the plan does not tell what its turns give, and what would', () => {
    const [words, ...more] = found([{ kind: 'home' }, rotation, ...pairs(beat(2))]);
    expect(words).toContain('2.rotate: What the 10 turns of this rotation would tell of G');
    expect(words).toContain('that of the near and far dwells alone. Rehearse it');
    expect(more).toEqual([]);
  });

  test('so does a registered method that the plan does not foresee', () => {
    expect(found([rotation], 'modulation')).toEqual([
      expect.stringContaining('evaluation.method: No u of G by the turns (modulation)') as string,
    ]);
    expect(found(pairs(beat(2)), 'period')).toEqual([expect.stringContaining('the time of swing') as string]);
    expect(found(pairs(beat(2)), 'equilibrium')).toEqual([]);
    expect(found(pairs(beat(2)))).toEqual([]);
  });
});

describe('shaped-period-unknown', () => {
  const shaped: Step[] = [{ kind: 'swing', to: 'far', profile: 'shaped' }, beat(2)];
  const found = (u: number | null) => {
    const period_s = u === null ? {} : { period_s: { value: T, u, unit: 's' as const } };
    const measured = { ...demoRigWide.measured };
    delete measured.period_s;
    const rig = { ...demoRigWide, measured: { ...measured, ...period_s } };
    return adviseProtocol({ formatVersion: 1, name: 'Test', steps: [swing('near'), beat(2), ...shaped] }, rig, { utcMs: 0, angleDeg: 0 })
      .filter(({ code }) => code === 'shaped-period-unknown')
      .map(({ path, message }) => `${path} ${message.slice(0, 45)}`);
  };

  test('two moves want the period to 0.7 %', () => {
    expect(found(0.0069 * T)).toEqual([]);
    expect(found(0.0071 * T)).toEqual(['3.swing The period of this rig is known to 0.71 %, an']);
    expect(found(null)).toEqual(['3.swing The period of this rig is not measured, and a']);
  });
});

describe('unequal-sides', () => {
  test('dwells of different lengths', () => {
    const [finding, ...others] = advice([{ kind: 'repeat', times: 4, steps: [swing('far'), dwell(830), swing('near'), dwell(1250)] }]);
    expect(others).toEqual([]);
    expect(finding).toMatchObject({ code: 'unequal-sides', path: null });
    expect(finding?.message).toContain('1250 s');
    expect(finding?.message).toContain('830 s');
  });

  test('one dwell more on one side is the rule of alternation, two are not', () => {
    const alternating = [beat(2), ...pairs(beat(2))];
    expect(codes(alternating)).toEqual([]);
    expect(codes([...alternating, { kind: 'dwell', periods: 2 }])).toContain('unequal-sides null');
  });

  test('a night on one side only is no series of reversals', () => {
    expect(codes([{ kind: 'repeat', times: 8, steps: [{ kind: 'dwell', periods: 2 }] }])).toEqual([]);
  });
});

describe('drift-not-cancelled', () => {
  test('all near dwells first, then all far ones', () => {
    const [finding] = advice([beat(2), { kind: 'dwell', periods: 2 }, swing('far'), beat(2), { kind: 'dwell', periods: 2 }]);
    expect(finding).toMatchObject({ code: 'drift-not-cancelled', path: null });
    expect(finding?.message).toContain('dwells 1 and 2');
  });

  test('one near and one far dwell', () => {
    const [finding] = advice([beat(2), swing('far'), beat(2)]);
    expect(finding).toMatchObject({ code: 'drift-not-cancelled' });
    expect(finding?.message).toContain('2 dwells');
  });

  test('near and far in turn, and the stations turned by 180 degrees with them', () => {
    expect(codes([swing('far'), beat(2), swing('near'), beat(2), swing('far'), beat(2)])).toEqual([]);
    expect(codes([swing('far'), beat(2), swing('nearBack'), beat(2), swing('farBack'), beat(2), swing('near'), beat(2)])).toEqual([]);
    expect(codes([swing('far'), beat(2), swing('farBack'), beat(2), swing('near'), beat(2)])).toEqual(['drift-not-cancelled null']);
  });
});

test('no built-in template pumps, nor is weak in any other way that is known here', () => {
  for (const template of templates) {
    for (const rig of template.id === 'four-station' ? [demoRigWide] : [demoRigWide, demoRigNarrow]) {
      const advice = adviseProtocol(template.make(rig), rig, { utcMs: 0, angleDeg: rig.motion?.homeDeg ?? 0 });
      // The time of swing has no u beforehand, which is no weakness of its protocol.
      expect({ id: template.id, codes: advice.map(({ code }) => code) }).toEqual({
        id: template.id,
        codes: template.id === 'time-of-swing' ? ['u-not-planned'] : [],
      });
    }
  }
});

test('each advice is two sentences', () => {
  const all = [
    ...advice(pairs(beat(1.5))),
    ...advice(pairs(beat(1))),
    ...advice([
      { kind: 'repeat', until: { relativeStatisticalU: 0.001 }, atMost: 40, steps: [swing('far'), beat(2), swing('near'), beat(2)] },
    ]),
    ...advice([beat(2), swing('far'), beat(2)]),
    ...advice([dwell(900), swing('far'), dwell(1300), swing('near'), dwell(900)]),
  ];
  expect(new Set(all.map(({ code }) => code))).toEqual(
    new Set(['cycle-pumps', 'dwell-short', 'no-ring-down', 'drift-not-cancelled', 'unequal-sides', 'optional-stopping']),
  );
  for (const { message } of all) expect(message.match(/[a-z0-9][.](?= |$)/g)).toHaveLength(2);
});

test('drafts that cannot be carried out are advised on without an exception', () => {
  expect(advice([{ kind: 'swing', to: 'nowhere' }, beat(2), { kind: 'repeat', times: 3, steps: [] }])).toEqual([]);
  expect(codes(pairs(dwell(620)), { ...demoRigWide, measured: undefined })).toEqual([]);
  expect(codes(pairs(dwell(620)), { ...demoRigWide, motion: undefined })).toEqual([]);
});

describe('what the document itself says', () => {
  const found = (protocol: ProtocolDocument, rig: RigDocument = demoRigWide) =>
    adviseProtocol(protocol, rig, { utcMs: 0, angleDeg: 0 }).map(({ code, path }) => `${code} ${path}`);

  test('fields that do nothing beside the others', () => {
    expect(
      found(
        document([
          { kind: 'home' },
          { kind: 'settle', for_s: 5, atMost_s: 9, otherwise: 'stop' },
          { kind: 'wait', until: { localTime: '06:30' }, otherwise: 'stop' },
          { kind: 'repeat', times: 2, atLeast: 2, atMost: 5, steps: [dwell(900)] },
        ]),
      ),
    ).toEqual(['no-effect 2.settle', 'no-effect 2.settle', 'no-effect 3.wait', 'no-effect 4.repeat']);
  });

  test('a move before homing', () => {
    expect(found(document([{ kind: 'mark', label: 'x' }, swing('near'), { kind: 'home' }]))).toEqual(['no-home 2.swing']);
    expect(found(document([dwell(900)]))).toEqual([]);
    expect(found(document([{ kind: 'repeat', times: 2, steps: [{ kind: 'home' }, swing('near')] }]))).toEqual([]);
  });

  test('drivers that are to be released where the turntable is not safe when free', () => {
    const releasing: ProtocolDocument = { ...document([{ kind: 'home' }, dwell(900)]), atEnd: { drivers: 'release' } };
    expect(found(releasing)).toEqual(['drivers-kept atEnd']);
    const safe = { ...demoRigWide, motion: { ...demoRigWide.motion, safeWhenFree: true } as RigDocument['motion'] };
    expect(found(releasing, safe)).toEqual([]);
    expect(found({ ...releasing, atEnd: { drivers: 'keep' } })).toEqual([]);
  });
});

test('a swing that reaches a station from the side from which it is not meant to be reached', () => {
  const near = { ...(demoRigWide.stations['near'] as RigDocument['stations'][string]), approach: 'ccw' as const };
  const rig: RigDocument = { ...demoRigWide, stations: { ...demoRigWide.stations, near } };
  const steps = (from: string): ProtocolDocument =>
    document([{ kind: 'home' }, swing(from), dwell(900), { kind: 'repeat', times: 2, steps: [swing('near'), swing(from)] }]);
  const found = (from: string) =>
    adviseProtocol(steps(from), rig, { utcMs: 0, angleDeg: 0 })
      .filter(({ code }) => code === 'other-side')
      .map(({ path }) => path);
  expect(found('far')).toEqual([]);
  expect(found('clear')).toEqual(['4.repeat.1.swing']);
});
