import { homingObstacle } from '@/shared/protocol/homing';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';

const with_ = (rig: RigDocument, motion: Partial<NonNullable<RigDocument['motion']>>): RigDocument => ({
  ...rig,
  motion: { ...(rig.motion as NonNullable<RigDocument['motion']>), ...motion },
});

describe('whether a rig may home by itself', () => {
  test('one without keep-out arcs may, from anywhere', () => {
    expect(homingObstacle(demoRigWide, null)).toBeNull();
    expect(homingObstacle(with_(demoRigWide, { homeDeg: 170 }), null)).toBeNull();
  });

  test('one with arcs may when the edge lies between near and far and no arc lies in the travel', () => {
    expect(homingObstacle(demoRigNarrow, null)).toBeNull();
  });

  test('a travel of a full turn or more leaves the level of the flag without meaning; from a known place it is not needed', () => {
    const full = with_(demoRigWide, { minDeg: -180, maxDeg: 180 });
    expect(homingObstacle(full, null)).toMatch(/180° to 180° is a full turn or more/);
    expect(homingObstacle(full, 90)).toBeNull();
    expect(homingObstacle(with_(demoRigWide, { minDeg: -179, maxDeg: 180 }), null)).toBeNull();
  });

  test('an edge that is not between near and far does not tell which way is safe', () => {
    expect(homingObstacle(with_(demoRigNarrow, { homeDeg: 31 }), null)).toMatch(/31°\) does not lie between near and far/);
    expect(homingObstacle(with_(demoRigNarrow, { homeDeg: 31 }), 60)).toBeNull();
  });

  test('an arc within the travel may lie on the way from an unknown place, and is named', () => {
    const rig = with_(demoRigWide, { keepOut: [[100, 110]] });
    expect(homingObstacle(rig, null)).toMatch(/not free: it meets the keep-out arc 100° to 110°/);
    expect(homingObstacle(rig, 90)).toBeNull();
    expect(homingObstacle(rig, 120)).toMatch(/from 120° to the edge is not free/);
  });

  test('a table that may make whole turns does not, where a rotation may have left it wound up: the flag does not count turns', () => {
    const turning = with_(demoRigWide, { turnsLimit: 3 });
    expect(homingObstacle(turning, null)).toMatch(/left its cables wound up \(motion.turnsLimit 3\)/);
    expect(homingObstacle(turning, 400)).toMatch(/stands at 400°, wound up/);
    expect(homingObstacle(turning, -175)).toBeNull();
    expect(homingObstacle(turning, 175 + 0.5 / (16_000 / 360))).toBeNull();
    expect(homingObstacle(with_(demoRigWide, { turnsLimit: 0.5 }), null)).toBeNull();
  });
});
