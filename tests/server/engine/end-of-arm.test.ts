import { endOfArm, knownAfter } from '@/server/engine/end-of-arm';
import type { ControllerState, LinkEvent } from '@/server/interfaces/turntable-link';

const at = { utcMs: 0, uS: 0 };
const controller: ControllerState = {
  bootId: 'boot-1',
  firmware: 'fake',
  positionKnown: true,
  angleDeg: 0,
  moving: false,
  interlockClosed: true,
  supplyPresent: true,
  armKey: true,
  driversOn: true,
  homeFlagCovered: false,
  leaseLive: false,
  warningDue: false,
};
const ready = (more: Partial<ControllerState> = {}): LinkEvent => ({
  kind: 'ready',
  at,
  sameBoot: true,
  unheard: null,
  controller: { ...controller, ...more },
});
const lost = { positionKnown: false, angleDeg: null };

describe('what ends the arm of a rig, run or no run', () => {
  test.each<[string, LinkEvent]>([
    ['the controller restarted', { kind: 'reset', at, bootId: 'boot-2' }],
    ['the motor supply was lost', { kind: 'supply', at, present: false }],
    ['the interlock was opened', { kind: 'interlock', at, closed: false }],
    ['the position was lost', { kind: 'standstill', at, commandId: 'stop-1', angleDeg: null }],
    ['the position was lost', ready(lost)],
    ['the controller restarted', ready({ bootId: 'boot-2' })],
  ])('%s', (why, event) => expect(endOfArm(event, { wasKnown: true, arm: { bootId: 'boot-1', fromUtcMs: 1000 } })).toBe(why));

  test('a rig that was never homed may be armed for homing, and the arm outlives a short gap of the line', () => {
    expect(endOfArm(ready(lost), { wasKnown: false, arm: { bootId: 'boot-1', fromUtcMs: 1000 } })).toBeNull();
    expect(endOfArm(ready(), { wasKnown: true, arm: { bootId: 'boot-1', fromUtcMs: 1000 } })).toBeNull();
    expect(endOfArm(ready({ bootId: 'boot-2' }), { wasKnown: true, arm: { bootId: null, fromUtcMs: 1000 } })).toBeNull();
  });

  test.each(['interlock', 'supply', 'arm-key'] as const)(
    '%s, while no server listened, unless that was before the arm was given',
    (input) => {
      const heard = (utcMs: number) =>
        endOfArm({ ...ready(), unheard: { input, utcMs } } as LinkEvent, { wasKnown: true, arm: { bootId: 'boot-1', fromUtcMs: 1000 } });
      expect(heard(1001)).toMatch(/^the .* while no server listened$/);
      expect(heard(999)).toBeNull();
    },
  );

  test('the position is known from homing until it is lost', () => {
    expect(knownAfter({ kind: 'homed', at, commandId: 'home-1', angleDeg: 0 }, false)).toBe(true);
    expect(knownAfter({ kind: 'lost', at, why: '' }, true)).toBe(true);
    expect(knownAfter({ kind: 'supply', at, present: false }, true)).toBe(false);
    expect(knownAfter({ kind: 'supply', at, present: true }, false)).toBe(false);
    expect(knownAfter({ kind: 'reset', at, bootId: 'boot-2' }, true)).toBe(false);
  });
});
