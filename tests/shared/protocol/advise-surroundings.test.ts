import { adviseProtocol } from '@/shared/protocol/advise';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { templateById } from '@/shared/protocol/templates';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { Surroundings } from '@/shared/protocol/advise-surroundings';
import type { RigDocument } from '@/shared/rig/document';

const short = templateById('near-far-short')?.make(demoRigWide) as ProtocolDocument;
const evening = Date.UTC(2031, 0, 14, 21, 0, 0);
/** In Berlin it is 22:00 when the night begins. */
const found = (around: Surroundings, utcMs = evening) =>
  adviseProtocol(short, demoRigWide, { utcMs, angleDeg: demoRigWide.motion?.homeDeg ?? 0, timeZone: 'Europe/Berlin', ...around }).filter(
    ({ code }) => ['late-finish', 'no-control', 'stale-calibration', 'waits-in-vain'].includes(code),
  );
const room = (from: string, until: string): Surroundings => ({ room: { nightWindow: { from, until }, blackouts: [] } });
const changed = (change: (rig: RigDocument) => void): RigDocument => {
  const rig = structuredClone(demoRigWide);
  change(rig);
  return rig;
};

test('what is not known of the surroundings is left unsaid', () => {
  expect(found({})).toEqual([]);
});

describe('late-finish', () => {
  test('a night that leaves the window says by how much and until when', () => {
    const [finding, ...others] = found(room('21:30', '22:30'));
    expect(others).toEqual([]);
    expect(finding).toMatchObject({ code: 'late-finish', path: null });
    expect(finding?.message).toMatch(/^It would end at 0\d:\d\d, 2.h \d+.min after the night window of the room \(21:30 to 22:30\)\. /u);
  });

  test('one that ends within it, that has no window, or that begins outside it anyway gives none', () => {
    expect(found(room('21:30', '06:30'))).toEqual([]);
    expect(found({ room: { nightWindow: null, blackouts: [] } })).toEqual([]);
    expect(found(room('21:30', '06:30'), Date.UTC(2031, 0, 14, 12))).toEqual([]);
  });
});

describe('no-control', () => {
  const loaded = { sources: { shape: 'sphere' as const } };

  test('where every mass set is loaded', () => {
    expect(found({ massSets: [loaded, loaded] })[0]?.message).toContain('All 2 mass sets of this rig are loaded');
    expect(found({ massSets: [loaded] })[0]?.code).toBe('no-control');
  });

  test('not where one is empty', () => {
    expect(found({ massSets: [loaded, { sources: { shape: 'none' } }] })).toEqual([]);
  });
});

describe('stale-calibration', () => {
  const first = { number: 1, document: demoRigWide };

  test('the period was measured before the balls were changed', () => {
    const heavier = changed((rig) => void (rig.pendulum.ballMass.value *= 1.01));
    const [finding] = found({ revisions: [{ number: 2, document: heavier }, first] });
    expect(finding?.message).toContain(
      'measured.period_s and measured.decayTime_s stand as in revision 1 of the rig, and revision 2 changed pendulum.ballMass after that',
    );
  });

  test('one figure measured anew is not stale, the other still is', () => {
    const heavier = changed((rig) => void (rig.pendulum.ballMass.value *= 1.01));
    const measuredAgain = structuredClone(heavier);
    if (measuredAgain.measured?.period_s) measuredAgain.measured.period_s.value = 421;
    const [finding] = found({ revisions: [{ number: 3, document: measuredAgain }, { number: 2, document: heavier }, first] });
    expect(finding?.message).toContain('measured.decayTime_s stands as in revision 1 of the rig, and revision 2 changed pendulum.ballMass');
    expect(finding?.message).not.toContain('period_s');
  });

  test('other changes, and a measurement that came with the change, do no harm', () => {
    const further = changed((rig) => void (rig.sources.orbit = { value: 0.13, u: 1e-4, unit: 'm' }));
    expect(found({ revisions: [{ number: 2, document: further }, first] })).toEqual([]);
    const all = changed((rig) => {
      rig.pendulum.ballMass.value *= 1.01;
      if (rig.measured?.period_s) rig.measured.period_s.value = 422;
      if (rig.measured?.decayTime_s) rig.measured.decayTime_s.value = 1070;
    });
    expect(found({ revisions: [{ number: 2, document: all }, first] })).toEqual([]);
  });
});

test('each is two sentences', () => {
  const heavier = changed((rig) => void (rig.pendulum.ballMass.value *= 1.01));
  const all = found({
    ...room('21:30', '22:30'),
    massSets: [{ sources: { shape: 'sphere' } }],
    revisions: [
      { number: 2, document: heavier },
      { number: 1, document: demoRigWide },
    ],
  });
  expect(all.map(({ code }) => code)).toEqual(['late-finish', 'no-control', 'stale-calibration']);
  for (const { message } of all) expect(message.match(/[a-z0-9)][.](?= |$)/g)).toHaveLength(2);
});

describe('waits-in-vain', () => {
  const waiting: ProtocolDocument = {
    ...short,
    steps: [
      { kind: 'wait', until: { channel: 'box temperature', below: 30 } },
      { kind: 'settle', calmWhen: { amplitude_urad: 30, window_s: 400 }, atMost_s: 1800 },
      { kind: 'wait', until: { localTime: '22:00' } },
      { kind: 'settle', for_s: 60 },
    ],
  };
  const advised = (channels: NonNullable<Surroundings['channels']>) =>
    adviseProtocol(waiting, demoRigWide, { utcMs: evening, angleDeg: 0, channels }).filter(({ code }) => code === 'waits-in-vain');

  test('each step that waits for what nothing fills says so, and what there is', () => {
    expect(advised([{ name: 'floor', role: 'environment' }])).toEqual([
      {
        code: 'waits-in-vain',
        path: '1.wait',
        message: expect.stringMatching(
          /^This step waits for the channel "box temperature", which no device of this rig fills \(filled are: floor\), so it would wait in vain for 1.h 30.min\. Let a device fill it/u,
        ),
      },
      {
        code: 'waits-in-vain',
        path: '2.settle',
        message: expect.stringMatching(/the deflection.*for 30.min\. .*settle for a fixed time\.$/u),
      },
    ]);
  });

  test('what is filled is waited for in peace', () => {
    const both = [
      { name: 'box temperature', role: 'environment' },
      { name: 'spot', role: 'deflection' },
    ];
    expect(advised(both)).toEqual([]);
  });
});
