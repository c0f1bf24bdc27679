import { judgeWaitedChannels, waitedFor, type RigChannel, type Waiting } from '@/server/http/waited-channels';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';

/** What a step waits for at 3 a.m. is looked at before the start. */

const now = Date.UTC(2031, 1, 14, 21);
const wait: Step = { kind: 'wait', until: { channel: 'box temperature', below: 24 }, atMost_s: 3600 };
const calm: Step = { kind: 'settle', calmWhen: { amplitude_urad: 20, window_s: 420 } };
const protocolOf = (...steps: Step[]): ProtocolDocument => ({ formatVersion: 1, name: 'Waits', steps: [{ kind: 'home' }, ...steps] });
const channel = (name: string, more: Partial<RigChannel> = {}): RigChannel => ({
  ...{ name, unit: 'degC', role: 'environment', rateHz: 1, lastUtcMs: now - 2_000 },
  ...more,
});
const spot = channel('spot', { unit: 'rad', role: 'deflection' });
const judged = (steps: Step[], more: Partial<Waiting>) =>
  judgeWaitedChannels({
    ...{ wanted: waitedFor(protocolOf(...steps)), channels: [channel('box temperature'), spot], deflection: 'spot', document: demoRigWide },
    ...{ nowUtcMs: now, ...more },
  });
const leverless = { ...demoRigWide };
delete leverless.lever;
const inMm = [channel('spot', { unit: 'mm', role: 'deflection' })];

test('where no step waits for a channel there is nothing to check', () => {
  expect(
    judged(
      [
        { kind: 'settle', for_s: 600 },
        { kind: 'wait', until: { localTime: '22:00' } },
      ],
      {},
    ),
  ).toBeNull();
});

test.each<[string, Step[], Partial<Waiting>, 'pass' | 'note' | 'fail', RegExp]>([
  ['flow', [wait, calm], {}, 'pass', /being filled: box temperature, spot\./],
  [
    'are not there',
    [wait],
    { channels: [spot] },
    'fail',
    /^2\.wait would wait in vain for 1\sh, then the run would hold: .*"box temperature". There are: spot\./,
  ],
  [
    'never had a sample',
    [wait],
    { channels: [channel('box temperature', { lastUtcMs: null })] },
    'fail',
    /box temperature has no sample yet/,
  ],
  ['are silent', [wait], { channels: [channel('box temperature', { lastUtcMs: now - 120_000 })] }, 'fail', /had no sample for 2\smin/],
  ['are slow', [wait], { channels: [channel('box temperature', { lastUtcMs: now - 120_000, rateHz: 1 / 60 })] }, 'pass', /being filled/],
  [
    'are lacking where the run goes on',
    [{ ...wait, otherwise: 'continue' }],
    { channels: [] },
    'note',
    /go on without it: .*There is none yet/,
  ],
  ['are no deflection', [calm], { deflection: null }, 'fail', /^2\.settle would wait in vain for 4\sh.*no deflection arrives by itself/],
  ['were never calibrated', [calm], { channels: inMm, document: leverless }, 'fail', /"spot" is in mm, so lever\.distance/],
])('channels that %s', (_name, steps, more, state, words) => {
  const outcome = judged(steps, more);
  expect(outcome?.state).toBe(state);
  expect(outcome?.detail.replaceAll('\u202f', ' ')).toMatch(words);
});

test('a channel that several steps wait for counts once, by the step that would hold', () => {
  const steps: Step[] = [{ kind: 'repeat', times: 3, steps: [{ ...wait, otherwise: 'continue' }, wait] }];
  expect(waitedFor(protocolOf(...steps)).map(({ path, otherwise }) => `${path} ${otherwise}`)).toEqual(['2.repeat.2.wait hold']);
});
