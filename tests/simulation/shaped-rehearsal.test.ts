import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { rehearsalParts } from '@/server/boot/rehearsal-parts';
import { rehearse } from '@/server/engine/rehearsal/rehearse';
import { rehearsalStart, startUtcMs } from './rehearsing';

/** Near minus far of the wide rig, rad (design reference A4). */
const stepRad = 0.002373825686861;

/** Half of peak to peak of the deflection in a row of the log, rad, on a rig without noise. */
async function ringing(steps: Step[], path: string): Promise<number> {
  const protocol: ProtocolDocument = { formatVersion: 1, name: 'Shaped', steps };
  const rig = { ...demoRigWide };
  delete rig.noise;
  const records = await rehearse({ start: { ...rehearsalStart(protocol), rig }, startUtcMs }, rehearsalParts());
  const row = records.steps.find((each) => each.path === path);
  const channel = records.channels.find(({ info }) => info.role === 'deflection');
  const within = [...(channel?.value ?? [])].filter((_value, index) => {
    const utcMs = channel?.utcMs[index] ?? 0;
    return row !== undefined && utcMs >= row.startUtcMs && utcMs <= (row.endUtcMs ?? 0);
  });
  return (Math.max(...within) - Math.min(...within)) / 2;
}

const start: Step[] = [{ kind: 'home' }, { kind: 'swing', to: 'near' }, { kind: 'settle', for_s: 12_000 }];
const dwell: Step = { kind: 'dwell', periods: 1 };

test('a rehearsal measures what a shaped swing leaves: next to nothing, where a plain one leaves the step', async () => {
  const shaped = await ringing([...start, { kind: 'swing', to: 'far', profile: 'shaped' }, dwell], '5.dwell');
  const plain = await ringing([...start, { kind: 'swing', to: 'far' }, dwell], '5.dwell');
  // Two turning points half a period apart: (1 + K)/2 of the first, K = 0.8214 (design reference A8).
  expect(plain / stepRad).toBeCloseTo((1 + 0.8214) / 2, 1);
  // The controller's microsteps of 1/44 deg are worth some 4e-4 of the step at the first move's end.
  expect(shaped / stepRad).toBeLessThan(1e-3);
});

test('a kick gives its amplitude', async () => {
  const found = await ringing([...start, { kind: 'kick', amplitude_urad: 2000, periods: 1 }], '4.kick');
  expect(Math.abs(found / (0.002 * ((1 + 0.8214) / 2)) - 1)).toBeLessThan(0.02);
});
