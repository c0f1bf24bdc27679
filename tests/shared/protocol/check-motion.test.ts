import { checkProtocol } from '@/shared/protocol/check';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';

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
const withMotion = (motion: Partial<NonNullable<RigDocument['motion']>>): RigDocument => ({
  ...demoRigWide,
  motion: { ...demoRigWide.motion, ...motion } as NonNullable<RigDocument['motion']>,
});

describe('stations', () => {
  test('an unknown one is named, with those the rig has', () => {
    const [finding] = check([home, { kind: 'swing', to: 'naer' }]);
    expect(finding).toMatchObject({ code: 'unknown-station', path: '2.swing' });
    expect(finding?.message).toContain('"naer"');
    expect(finding?.message).toContain('near, far, clear, inline, across, nearBack, farBack');
  });

  test('names that every object has are no stations', () => {
    expect(places([home, { kind: 'swing', to: 'constructor' }, { kind: 'swing', to: '__proto__' }])).toEqual([
      'unknown-station 2.swing',
      'unknown-station 3.swing',
    ]);
  });

  test('the station at the end counts too', () => {
    expect(checkProtocol(protocol([home, dwell], { atEnd: { station: 'parked' } }), demoRigWide)).toEqual([
      expect.objectContaining({ code: 'unknown-station', path: 'atEnd' }),
    ]);
  });
});

describe('the path rule', () => {
  const to = (angle_deg: number): Step => ({ kind: 'swing', to: { angle_deg } });

  test('the limits themselves can be reached, beyond them is refused with the limit', () => {
    expect(places([home, to(175), to(-175)])).toEqual([]);
    const [finding] = check([home, to(175.01)]);
    expect(finding).toMatchObject({ code: 'out-of-limits', path: '2.swing' });
    expect(finding?.message).toContain('motion.maxDeg 175°');
  });

  test('nothing wraps: from −159.82 to 159.82 the path crosses everything between', () => {
    const rig = withMotion({ keepOut: [[40, 60]] });
    // Reached from home without meeting the arc or its images at −140…−120 and 220…240.
    expect(places([home, to(-100)], rig)).toEqual([]);
    expect(places([home, to(-100), to(100)], rig)).toEqual(['keep-out 3.swing']);
  });

  test('an arc that lies across the path is named', () => {
    const [finding] = check([home, { kind: 'swing', to: 'clear' }], withMotion({ keepOut: [[40, 60]] }));
    expect(finding).toMatchObject({ code: 'keep-out', path: '2.swing' });
    expect(finding?.message).toContain('from 0° to 90°');
    expect(finding?.message).toContain('40° to 60°');
  });

  test('its image by 180 degrees is met by the other source', () => {
    const [finding] = check([home, { kind: 'swing', to: 'nearBack' }], withMotion({ keepOut: [[40, 60]] }));
    expect(finding).toMatchObject({ code: 'keep-out', path: '2.swing' });
    expect(finding?.message).toContain('−140° to −120°');
    expect(places([home, to(100)], withMotion({ keepOut: [[-130, -100]] }))).toEqual(['keep-out 2.swing']);
  });

  test('touching the edge of an arc is meeting it, staying off it by a hundredth is not', () => {
    expect(places([home, to(40)], withMotion({ keepOut: [[40, 60]] }))).toEqual(['keep-out 2.swing']);
    expect(places([home, to(39.99)], withMotion({ keepOut: [[40, 60]] }))).toEqual([]);
  });

  test('the close rig turns between its stations through 90 degrees, and never through 0', () => {
    expect(places([home, near, far, near], demoRigNarrow)).toEqual([]);
    expect(places([home, to(0)], demoRigNarrow)).toEqual(['out-of-limits 2.swing', 'keep-out 2.swing']);
    expect(places([home, near, to(-32.62)], withNarrowLimits(-150, 150))).toEqual(['keep-out 3.swing']);
  });

  const withNarrowLimits = (minDeg: number, maxDeg: number): RigDocument => ({
    ...demoRigNarrow,
    motion: { ...demoRigNarrow.motion, minDeg, maxDeg } as NonNullable<RigDocument['motion']>,
  });

  test('the second pass of a repeat begins where the first ended', () => {
    const rig = withMotion({ keepOut: [[100, 110]], homeDeg: 90 });
    // 90 → 20 → 95: in the second pass 95 → 20 is free; but 95 → 120 of another protocol is not.
    expect(places([home, repeat(2, to(20), to(95))], rig)).toEqual([]);
    const turned = withMotion({ keepOut: [[50, 60]], homeDeg: 0 });
    expect(places([home, repeat(2, to(20), to(40))], turned)).toEqual([]);
    expect(places([home, { kind: 'repeat', times: 1, steps: [to(-90)] }, to(40)], withMotion({ keepOut: [[-60, -50]] }))).toEqual([
      'keep-out 2.repeat.1.swing',
      'keep-out 3.swing',
    ]);
  });

  test('a repeat that may run no pass at all leaves both ways open', () => {
    const rig = withMotion({ keepOut: [[50, 60]] });
    const until: Step = { kind: 'repeat', until: { localTime: '06:30' }, steps: [to(20), dwell] };
    expect(places([home, to(45), until, to(-5)], rig)).toEqual([]);
    const other = withMotion({ minDeg: -175, keepOut: [[-60, -50]] });
    expect(places([home, until, { kind: 'swing', to: 'far' }], other)).toEqual([]);
  });

  test('the last move counts too, from wherever the sources then stand', () => {
    expect(checkProtocol(protocol([home, near], { atEnd: { station: 'clear' } }), withMotion({ keepOut: [[40, 60]] }))).toEqual([
      expect.objectContaining({ code: 'keep-out', path: 'atEnd' }),
    ]);
  });

  test('homing to a place inside an arc is refused', () => {
    expect(places([home, { kind: 'settle', for_s: 5 }], withMotion({ keepOut: [[-10, 10]] }))).toEqual(['keep-out 1.home']);
  });
});

describe('motion', () => {
  test('the first motion must follow home where the controller does not know the position', () => {
    const lost = (steps: Step[], more: Partial<ProtocolDocument> = {}) =>
      checkProtocol(protocol(steps, more), demoRigWide, { angleDeg: null }).map(({ code, path }) => `${code} ${path}`);
    expect(lost([near, dwell, far, dwell])).toEqual(['home-first 1.swing']);
    expect(lost([dwell, home, near])).toEqual([]);
    expect(lost([dwell], { atEnd: { station: 'clear' } })).toEqual(['home-first atEnd']);
  });

  test('without a start a first move is judged by where it ends, all others by their way', () => {
    expect(places([near, dwell, far, dwell])).toEqual([]);
    const rig = withMotion({ keepOut: [[40, 60]] });
    const to = (angle_deg: number): Step => ({ kind: 'swing', to: { angle_deg } });
    expect(places([to(90), dwell, near], rig)).toEqual(['keep-out 3.swing']);
    expect(places([to(50), dwell], rig)).toEqual(['keep-out 1.swing']);
    expect(places([to(200), dwell])).toEqual(['out-of-limits 1.swing']);
  });

  test('a start at a known angle needs no home, and the path counts from there', () => {
    expect(checkProtocol(protocol([near, dwell]), demoRigWide, { angleDeg: 0 })).toEqual([]);
    expect(checkProtocol(protocol([near, dwell]), withMotion({ keepOut: [[40, 60]] }), { angleDeg: 90 })).toEqual([
      expect.objectContaining({ code: 'keep-out', path: '1.swing' }),
    ]);
  });

  test('no step is faster than the rig', () => {
    expect(places([home, { kind: 'swing', to: 'near', speed_deg_s: 6, acceleration_deg_s2: 2 }])).toEqual([]);
    const findings = check([home, { kind: 'swing', to: 'near', speed_deg_s: 7, acceleration_deg_s2: 3 }]);
    expect(findings.map(({ code, path }) => `${code} ${path}`)).toEqual(['too-fast 2.swing', 'too-fast 2.swing']);
    expect(findings[0]?.message).toContain('up to 6 deg/s');
  });

  test('a drive too fine for the link to its controller is refused', () => {
    expect(places([home, near], withMotion({ stepsPerDegree: 16_000 }))).toEqual([]);
    const [finding] = check([home, near], withMotion({ stepsPerDegree: 20_000 }));
    expect(finding).toMatchObject({ code: 'motion-out-of-range', path: null });
    expect(finding?.message).toContain('motion.maxSpeed_deg_s');
    expect(places([home], withMotion({ stepsPerDegree: 60_000, maxSpeed_deg_s: 1, maxAcceleration_deg_s2: 1 }))).toEqual([
      'motion-out-of-range null',
    ]);
  });

  test('a rig without motion cannot run a protocol', () => {
    expect(places([home, near], { ...demoRigWide, motion: undefined })).toEqual(['motion-missing null']);
  });
});

describe('lengths in periods', () => {
  const unmeasured = { ...demoRigWide, measured: undefined };

  test('need a measured period', () => {
    expect(places([home, near, beat, { kind: 'dwell', periods: 2 }, dwell], unmeasured)).toEqual([
      'period-missing 3.dwell',
      'period-missing 4.dwell',
    ]);
  });

  test('a beat directly follows a swing', () => {
    expect(places([home, near, { kind: 'mark', label: 'x' }, beat])).toEqual(['beat-needs-swing 4.dwell']);
    expect(places([home, near, beat, beat])).toEqual(['beat-needs-swing 4.dwell']);
    expect(places([home, beat])).toEqual(['beat-needs-swing 2.dwell']);
  });

  test('a swing before a repeat serves its first pass only', () => {
    expect(places([home, near, repeat(1, beat, far), beat])).toEqual([]);
    expect(places([home, near, repeat(2, beat, far)])).toEqual([]);
    expect(places([home, near, repeat(2, beat, dwell)])).toEqual(['beat-needs-swing 3.repeat.1.dwell']);
  });

  test('the swing is shorter than the beat', () => {
    // Near to far takes 9.73 s; 0.02 periods are 8.4 s.
    const [finding] = check([home, near, far, { kind: 'dwell', beat_periods: 0.02 }]);
    expect(finding).toMatchObject({ code: 'beat-too-short', path: '4.dwell' });
    expect(finding?.message).toContain('9.7 s');
    expect(places([home, near, far, { kind: 'dwell', beat_periods: 0.024 }])).toEqual([]);
  });
});

describe('kicks and shaped swings', () => {
  const shaped: Step = { kind: 'swing', to: 'far', profile: 'shaped' };
  const kick = (amplitude: number): Step => ({ kind: 'kick', amplitude_urad: amplitude });

  test('are accepted where the rig allows them, and a beat counts from the first move', () => {
    expect(places([home, near, kick(2000), shaped, beat])).toEqual([]);
    expect(places([home, near, shaped, { kind: 'dwell', beat_periods: 0.5 }])).toEqual(['beat-too-short 4.dwell']);
  });

  // D/(1 − K) = 2.3738 mrad / (1 − 0.8214) (design reference A4, A8).
  test('a kick beyond what any number of moves gives is refused with the limit', () => {
    const [finding] = check([home, near, kick(20_000)]);
    expect(finding).toMatchObject({ code: 'kick-too-large', path: '3.kick' });
    expect(finding?.message).toMatch(/an amplitude below 1329\d µrad/);
  });

  test('a shaped swing between equal rests is refused, and both without a measured decay', () => {
    expect(places([home, near, { kind: 'swing', to: 'nearBack', profile: 'shaped' }])).toEqual(['shaped-impossible 3.swing']);
    const measured = { ...demoRigWide.measured };
    delete measured.decayTime_s;
    expect(places([home, near, kick(2000), shaped], { ...demoRigWide, measured })).toEqual([
      'period-missing 3.kick',
      'period-missing 4.swing',
    ]);
  });

  test('a kick keeps to the limits of the table, and waits for homing where the position is not known', () => {
    expect(places([home, kick(500)], withMotion({ maxDeg: 15, minDeg: -15 })).includes('out-of-limits 2.kick')).toBe(true);
    const findings = checkProtocol(protocol([kick(500), home]), demoRigWide, { angleDeg: null });
    expect(findings.map(({ code, path }) => `${code} ${path}`)).toContain('home-first 1.kick');
  });

  test('an empty control makes the same moves', () => {
    const empty: RigDocument = { ...demoRigWide, sources: { shape: 'none', count: 2 } };
    expect(places([home, near, kick(2000), shaped, beat], empty)).toEqual([]);
  });
});

describe('rotations', () => {
  const rotate = (turns: number, period_s = 1800): Step => ({ kind: 'rotate', period_s, turns });
  const rotations = (steps: Step[], rig: RigDocument) => check(steps, rig);
  const codes = (steps: Step[], rig: RigDocument) => rotations(steps, rig).map(({ code, path }) => `${code} ${path}`);

  test('are accepted up to the turns that the cables stand, either way, whatever the limits of swings', () => {
    const rig = withMotion({ turnsLimit: 3 });
    expect(codes([home, rotate(3), near, rotate(-3), { kind: 'swing', to: 'far' }, dwell], rig)).toEqual([]);
    const [finding] = rotations([home, rotate(-4)], rig);
    expect(finding).toMatchObject({ code: 'turns-limit', path: '2.rotate' });
    expect(finding?.message).toContain('up to 3 either way');
  });

  test('are refused on a rig that does not say what its cables stand', () => {
    const [finding] = rotations([home, rotate(1)], demoRigWide);
    expect(finding).toMatchObject({ code: 'turns-limit', path: '2.rotate' });
    expect(finding?.message).toContain('motion.turnsLimit 0');
  });

  test('meet every keep-out arc, which is named', () => {
    const [finding] = rotations([home, rotate(1)], withMotion({ turnsLimit: 3, keepOut: [[40, 60]] }));
    expect(finding).toMatchObject({ code: 'keep-out', path: '2.rotate' });
    expect(finding?.message).toContain('40° to 60°');
  });

  test('are no faster than the rig: the shortest turn is named', () => {
    // 6 deg/s: a turn in 60 s.
    const rig = withMotion({ turnsLimit: 3 });
    expect(codes([home, rotate(1, 60)], rig)).toEqual([]);
    const [finding] = rotations([home, rotate(1, 59)], rig);
    expect(finding).toMatchObject({ code: 'too-fast', path: '2.rotate' });
    expect(finding?.message).toContain('from 60 s');
  });

  test('keep to what the link can write: 624 turns of 16,000 microsteps and 15,999 more', () => {
    const rig = withMotion({ turnsLimit: 1000 });
    expect(codes([home, rotate(624, 60), rotate(-624, 60)], rig)).toEqual([]);
    const [finding] = rotations([home, rotate(625, 60)], rig);
    expect(finding).toMatchObject({ code: 'motion-out-of-range', path: '2.rotate' });
    expect(finding?.message).toContain('up to 624');
  });

  test('end where they began, and are no swing that a beat could count from', () => {
    expect(codes([home, near, rotate(2), beat], withMotion({ turnsLimit: 3 }))).toEqual(['beat-needs-swing 4.dwell']);
  });

  test('wait for homing where the position is not known', () => {
    const findings = checkProtocol(protocol([rotate(1), home]), withMotion({ turnsLimit: 1 }), { angleDeg: null });
    expect(findings.map(({ code, path }) => `${code} ${path}`)).toContain('home-first 1.rotate');
  });
});
