import type { RigView } from '@/shared/contracts/rigs';
import { mayGoIn } from '@/shared/morning/may-go-in';
import { demoRigWide } from '@/shared/rig/demo-rigs';

/** Whoever reads yes reaches in: every doubt has to come out as no, or as not known. */

const live: RigView['live'] = {
  ...{ condition: 'ready', detail: '', lastReplyAt: '2031-03-15T05:53:00.000Z', roundTripMs: 3, discardedLines: 0 },
  ...{ positionKnown: true, angleDeg: 0, moving: false, interlockClosed: true, supplyPresent: true, armKey: false, driversOn: false },
};
const quiet = { live, arm: null, arming: null, locks: [], activeRun: null, document: demoRigWide };
const arm = { id: 'a', name: 'Anna Quell', from: '2031-03-14T20:00:00.000Z', until: '2031-03-15T07:00:00.000Z', note: '' };
const lock = { id: 'l', userId: 'u', name: 'Bo Fennel', note: '', since: '2031-03-15T05:00:00.000Z' };
const asked = (changes: Partial<Parameters<typeof mayGoIn>[0]>) => mayGoIn({ ...quiet, ...changes }, 'Europe/Zurich');

test('yes at a rig that is heard, at rest, without a run and not armed', () => {
  expect(asked({})).toEqual({
    answer: 'yes',
    words: 'Nothing moves before somebody arms it with the key. Set your lock before you reach in.',
    facts: ['sources at inline', 'motor off', 'door closed', 'not armed', 'heard 06:53'],
  });
  expect(asked({ live: { ...live, angleDeg: 0.01 + (demoRigWide.stations['near']?.value ?? NaN) } }).facts[0]).toBe('sources at near');
  expect(asked({ live: { ...live, angleDeg: 12.5 } }).facts[0]).toBe('sources at 12.50°');
});

test('no while it moves, while a run is on, held or not, and while it is armed', () => {
  expect(asked({ live: { ...live, moving: true } }).answer).toBe('no');
  expect(asked({ activeRun: { id: 'r', state: 'held', protocolName: 'Night' } })).toMatchObject({
    answer: 'no',
    words: 'A run of Night is on: hold or stop it first.',
  });
  expect(asked({ arm })).toMatchObject({
    answer: 'no',
    words: expect.stringContaining('Armed for Anna Quell until 08:00 Sat, Europe/Zurich'),
  });
  // An arm counts although the controller is not heard: the line may come back.
  expect(asked({ arm, live: { ...live, condition: 'lost' } }).answer).toBe('no');
});

test('no while somebody is arming it, and while its key is on', () => {
  const arming = { name: 'Anna Quell', until: arm.until, stage: 'leave' as const, endsAt: '2031-03-15T05:55:00.000Z' };
  expect(asked({ arming })).toMatchObject({ answer: 'no', words: expect.stringContaining('Anna Quell is arming it') });
  expect(asked({ live: { ...live, armKey: true } })).toMatchObject({ answer: 'no', words: expect.stringContaining('arm key is on') });
});

test.each(['closed', 'opening', 'lost', 'refused'] as const)('not known while the line is %s, whatever was heard last', (condition) => {
  expect(asked({ live: { ...live, condition } }).answer).toBe('unknown');
});

test('what the controller has not told is called not known', () => {
  const untold = { ...live, positionKnown: false, interlockClosed: null, driversOn: null, lastReplyAt: null };
  expect(asked({ live: untold }).facts).toEqual([
    'sources not known',
    'motor not known',
    'door not known',
    'not armed',
    'controller never heard',
  ]);
});

test('with somebody at work in it, ask there', () => {
  expect(asked({ locks: [lock] })).toMatchObject({ answer: 'yes', words: expect.stringContaining('Bo Fennel is at work in it') });
});
