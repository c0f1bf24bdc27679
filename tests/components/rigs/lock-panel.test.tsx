import { act, fireEvent, screen } from '@testing-library/react';
import { useState } from 'react';
import { useSession } from '@/components/api';
import { BlindLock, LockPanel } from '@/components/rigs/lock-panel';
import type { RigView } from '@/shared/contracts/rigs';
import type { Role } from '@/shared/contracts/roles';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { problem, settled, showInLab, startFakeLab, type FakeLab } from '../support/fake-lab';

/** "My hands are in the rig" on a network that fails, and with a server whose database is away. */

const rig: RigView = {
  ...{ id: 'rig-1', name: 'North bench', revision: 1, link: { kind: 'simulated' } },
  ...{ arm: null, arming: null, disarmed: null, locks: [], signatures: [], activeRun: null, position: null },
  ...{ document: demoRigWide, massSets: [] },
  live: {
    ...{ condition: 'ready', detail: '', lastReplyAt: null, roundTripMs: null, discardedLines: 0, positionKnown: true, angleDeg: 0 },
    ...{ moving: true, interlockClosed: true, supplyPresent: true, armKey: true, driversOn: true },
  },
};
const set = 'POST /labs/lab-1/rigs/rig-1/locks';
const lock = { id: 'lock-1', userId: 'u1', name: 'Ada Thornfield', note: '', since: '2031-03-14T01:14:00.250Z' };

function Page({ locks = [] }: { locks?: RigView['locks'] }) {
  const [readAtMs, setReadAtMs] = useState(Date.now);
  if (useSession().membership === null) return null;
  return (
    <>
      <LockPanel rig={{ ...rig, locks }} readAtMs={readAtMs} />
      <button type="button" data-testid="read-anew" onClick={() => setReadAtMs(Date.now())} />
    </>
  );
}

beforeEach(() => jest.useFakeTimers({ now: Date.UTC(2031, 2, 14, 1, 14, 0) }));
afterEach(() => jest.useRealTimers());

async function open(role: Role = 'operator'): Promise<FakeLab> {
  const lab = startFakeLab(role);
  await showInLab(<Page />);
  return lab;
}

const after = (ms: number) => act(() => jest.advanceTimersByTimeAsync(ms));
const tap = async () => {
  fireEvent.click(screen.getByTestId('set-lock'));
  await settled();
  await after(0);
};
const sentence = () => screen.getByTestId('lock-sentence').textContent ?? '';
const keys = (lab: FakeLab) => lab.requests(set).map(({ headers }) => headers.get('idempotency-key'));

test('one tap, one answer: what was sent and that the server has it stand apart, and "hands in the rig" only with the second', async () => {
  const lab = await open();
  let answer: () => void = () => undefined;
  const { fetch } = globalThis;
  globalThis.fetch = (async (...request: Parameters<typeof fetch>) => {
    if (request[1]?.method === 'POST') await new Promise<void>((resolve) => (answer = resolve));
    return fetch(...request);
  }) as typeof fetch;
  lab.on(set, () => ({ status: 201, body: lock }));
  await tap();
  expect(screen.getByTestId('lock-stages').textContent).toMatch(/Sent.*Server has it…/);
  expect(screen.queryByTestId('locked-notice')).toBeNull();
  answer();
  await settled();
  await after(0);
  expect(screen.getByTestId('lock-stages').textContent).toMatch(/Server has it02:14/);
  expect(screen.getByTestId('locked-notice').textContent).toContain('Ada Thornfield has hands in the rig. Nothing moves.');
  expect(screen.queryByTestId('set-lock')).toBeNull();
});

test('a server without its database, or at work on the first attempt, is asked again with the same key, until it answers', async () => {
  const lab = await open();
  const answers = [problem(503, 'database-away', 'away'), problem(409, 'still-running', 'at work')];
  lab.on(set, () => answers.shift() ?? { status: 201, body: lock });
  await tap();
  await after(350);
  expect(sentence()).toMatch(/^Not locked: no answer yet, trying again \(2\)\. Use the switch or the key at the rig\.$/);
  await after(600);
  expect(sentence()).toBe('');
  expect(screen.getByTestId('locked-notice')).toBeTruthy();
  await after(60_000);
  expect(keys(lab)).toHaveLength(3);
  expect(new Set(keys(lab)).size).toBe(1);
});

test('without a network it is said plainly that nothing is locked and what to use; after 30 s nothing more is sent, a tap begins anew', async () => {
  const lab = await open();
  lab.away = true;
  await tap();
  expect(screen.getByTestId('set-lock').getAttribute('aria-disabled')).not.toBe('true');
  expect(sentence()).toMatch(/Not locked: no answer yet.*Use the switch or the key at the rig/);
  await after(31_000);
  expect(sentence()).toMatch(/Not locked: no answer in 30 s after 8 attempts\. Use the switch or the key at the rig\./);
  expect(screen.queryByTestId('locked-notice')).toBeNull();
  lab.away = false;
  lab.on(set, () => ({ status: 201, body: lock }));
  await after(60_000);
  expect(keys(lab)).toEqual([]);
  await tap();
  expect(screen.getByTestId('locked-notice')).toBeTruthy();
});

test('a refusal is final and tells its reason, and the switch', async () => {
  const lab = await open();
  lab.on(set, () => problem(404, 'not-found', 'There is no such rig.'));
  await tap();
  await after(40_000);
  expect(keys(lab)).toHaveLength(1);
  expect(sentence()).toBe('Not locked: There is no such rig. Use the switch or the key at the rig.');
});

test('what the server answered stands on the page while the rig cannot be read, and goes when the rig was read without it', async () => {
  const lab = await open();
  lab.on(set, () => ({ status: 201, body: lock }));
  await tap();
  await after(120_000);
  expect(screen.getAllByTestId('locked-notice')).toHaveLength(1);
  fireEvent.click(screen.getByTestId('read-anew'));
  await settled();
  expect(screen.queryByTestId('locked-notice')).toBeNull();
  expect(screen.getByTestId('set-lock')).toBeTruthy();
});

test('a rig that cannot be read at all can be locked', async () => {
  const lab = startFakeLab('operator');
  lab.on(set, () => ({ status: 201, body: lock }));
  await showInLab(<Blind />);
  await tap();
  expect(screen.getByTestId('locked-notice').textContent).toContain('Ada Thornfield has hands in the rig.');
});

function Blind() {
  return useSession().membership === null ? null : <BlindLock rigId="rig-1" />;
}

test('lifting is sent once and never again by itself', async () => {
  const lab = startFakeLab('operator');
  const lift = 'POST /labs/lab-1/rigs/rig-1/locks/lock-1/lift';
  lab.on(lift, () => problem(503, 'database-away', 'The database does not answer.'));
  await showInLab(<Page locks={[lock]} />);
  for (const testId of ['lift-lock', 'lift-sure', 'lift-confirm']) {
    fireEvent.click(screen.getByTestId(testId));
    await settled();
  }
  await after(60_000);
  expect(lab.requests(lift)).toHaveLength(1);
  expect(screen.getByTestId('lift-sheet').textContent).toContain('The lock was not lifted');
});
