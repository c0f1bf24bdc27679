import { checkAtStart } from '@/server/engine/check-at-start';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { templateById } from '@/shared/protocol/templates';
import { demoRigWide } from '@/shared/rig/demo-rigs';

const protocol = templateById('near-far-short')?.make(demoRigWide) as ProtocolDocument;
const codes = (rig: typeof demoRigWide, angleDeg: number | null = 0) =>
  checkAtStart({ protocol, rig, timeZone: 'UTC' }, { controller: { positionKnown: angleDeg !== null, angleDeg }, limits: null }, 0).map(
    ({ code }) => code,
  );

test('a run in which the pendulum would swing out beyond 0.8 of its travel, or leave the range of the readout, is refused', () => {
  const within = (travel_rad: number) => ({
    ...demoRigWide,
    pendulum: { ...demoRigWide.pendulum, travel_rad },
    readout: { range_rad: 0.03 },
  });
  // It rests at 1.19 mrad on either side, and each swing of 2.37 mrad carries it beyond.
  expect(codes(within(0.0015))).toEqual(['excursion']);
  expect(codes(within(0.0015), null)).toEqual(['excursion']);
  expect(codes(within(0.05))).toEqual([]);
  expect(codes({ ...within(0.05), readout: { range_rad: 0.0012 } })).toEqual(['excursion']);
});

test('of a shuffled protocol the order is judged that the run will have', () => {
  const block = (to: string): Step => ({
    kind: 'repeat',
    times: 1,
    steps: [
      { kind: 'swing', to },
      { kind: 'dwell', for_s: 210 },
    ] as Step[],
  });
  const blocks: Step = { kind: 'repeat', times: 1, order: 'shuffled', steps: ['near', 'near', 'near', 'far', 'far', 'far'].map(block) };
  const rig = { ...demoRigWide, pendulum: { ...demoRigWide.pendulum, travel_rad: 0.0075 } };
  const run = {
    protocol: { formatVersion: 1, name: 'Shuffled', steps: [{ kind: 'home' }, blocks] } as ProtocolDocument,
    rig,
    timeZone: 'UTC',
  };
  const controller = { positionKnown: true, angleDeg: 0 };
  const codesOf = (shuffleSeed: number) => checkAtStart({ ...run, shuffleSeed }, { controller, limits: null }, 0).map(({ code }) => code);
  // Near and far by turns, every half period, swing it up to 8.2 mrad; where two of a kind come together it swings back: 3.9 mrad. The limit is 6.
  expect(codesOf(1)).toEqual([]);
  expect(codesOf(6)).toEqual(['excursion']);
});
