import { healthRows, inputRows } from '@/components/link/line-words';
import type { LinkHealthView } from '@/shared/contracts/link';

const nowMs = Date.parse('2031-03-14T20:00:00.000Z');
const controller = {
  ...{ bootId: '00001A2B', firmware: 'evenfall-0.1', positionKnown: true, angleDeg: 0, moving: false, interlockClosed: true },
  ...{ supplyPresent: true, armKey: true, driversOn: true, homeFlagCovered: false, leaseLive: false, warningDue: false },
};
const healthy: LinkHealthView = {
  ...{
    condition: 'ready',
    detail: '',
    lastReplyAt: '2031-03-14T19:59:59.600Z',
    roundTripMs: 2.4,
    roundTripP50Ms: 2.2,
    roundTripP95Ms: 3.1,
  },
  ...{ discardedLines: 0, discardedBytes: 0, droppedByController: 0, retries: 0, reconnects: 0, protocol: '1.0', keptOutBy: null },
  ...{ clock: { offsetMs: 102_481.204, uMs: 0.2 }, drift: { ppm: 18.04, uPpm: 0.31 } },
};
const rowsOf = (change: Partial<LinkHealthView> = {}) =>
  new Map(healthRows({ health: { ...healthy, ...change }, controller }, nowMs).map((row) => [row.label, row]));
const plain = (text: string | undefined) => text?.replace(/[\u2009\u202f]/g, ' ');

test('a healthy line is told in figures with units and uncertainties, and nothing is advised', () => {
  const rows = rowsOf();
  expect(plain(rows.get('Round trip')?.value)).toBe('2.2 ms');
  expect(plain(rows.get('Clock offset')?.value)).toBe('+102.481 20 s');
  expect(plain(rows.get('Clock offset')?.aside)).toBe('± 0.2 ms');
  expect(plain(rows.get('Clock drift')?.value)).toBe('+18.0 ppm');
  expect(plain(rows.get('Clock drift')?.aside)).toBe('± 0.31 ppm');
  expect(rows.get('Firmware')).toMatchObject({ value: 'evenfall-0.1', aside: 'line protocol 1.0' });
  expect([...rows.values()].map(({ advice }) => advice).filter((advice) => advice !== '')).toEqual([]);
});

test.each([
  ['State', { condition: 'lost' as const }, 'bad', 'See to plug, cable'],
  ['Last answer', { lastReplyAt: '2031-03-14T19:59:54.000Z' }, 'bad', 'twice a second'],
  ['Last answer', { lastReplyAt: null }, 'bad', 'twice a second'],
  ['Round trip', { roundTripP95Ms: 180 }, 'look', 'hold and stop take longer'],
  ['Dropped there', { droppedByController: 7 }, 'look', 'None of them moved anything'],
  ['Clock offset', { clock: { offsetMs: 1, uMs: 40 } }, 'look', 'within a minute'],
])('%s that is bad says what to do', (label, change, state, words) => {
  expect(rowsOf(change).get(label)).toMatchObject({ state, advice: expect.stringContaining(words) });
});

test('inputs are named as everywhere, and what forbids motion stands out', () => {
  const states = (change: Partial<typeof controller>) =>
    inputRows({ ...controller, ...change })
      .filter(({ state }) => state === 'bad' || state === 'look')
      .map(({ label, words }) => `${label}: ${words}`);
  expect(states({})).toEqual([]);
  expect(states({ interlockClosed: false, armKey: false, warningDue: true })).toEqual([
    'Interlock: open',
    'Arm key: off',
    'Warning: comes for 10 s before the next move',
  ]);
});
