import { act, fireEvent, screen } from '@testing-library/react';
import { useSession } from '@/components/api';
import { StartScreen } from '@/components/rigs/start-screen';
import type { LockView } from '@/shared/contracts/standing';
import { cautionsVersion } from '@/shared/rig/cautions';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { params, went } from '../support/fake-router';
import { problem, showInLab, startFakeLab, type FakeLab } from '../support/fake-lab';

const live = {
  condition: 'ready',
  detail: '',
  lastReplyAt: null,
  roundTripMs: null,
  discardedLines: 0,
  positionKnown: true,
  angleDeg: 0,
  moving: false,
  interlockClosed: true,
  supplyPresent: true,
  armKey: true,
  driversOn: true,
};
const arm = {
  id: 'a1',
  name: 'Bram Oakhurst',
  from: '2031-03-13T18:00:00Z',
  until: '2031-03-14T10:00:00Z',
  note: 'camera glued, do not level',
};
const summary = {
  id: 'p1',
  name: 'Overnight reversals',
  updatedAt: '2031-03-13T18:00:00Z',
  updatedBy: 'Ada Thornfield',
  latestRevision: 7,
  draftDiffers: false,
  stepCount: 1,
};
const protocol = {
  ...summary,
  document: { formatVersion: 1, name: 'Overnight reversals', steps: [{ kind: 'home' }] },
  revisions: [{ number: 7, issuedAt: '2031-03-13T18:00:00Z', issuedBy: 'Ada Thornfield', note: '' }],
};
const check = (code: string, state: string, detail: string, figures: object[] = []) => ({ code, title: code, state, detail, figures });
const run = {
  id: 'run-1',
  rigId: 'rig-1',
  rigName: 'North bench',
  protocolId: 'p1',
  protocolName: 'Overnight reversals',
  protocolRevision: 7,
  state: 'starting',
  rehearsal: false,
  operator: 'Ada Thornfield',
  createdAt: '2031-03-13T19:00:00Z',
  startedAt: null,
  endedAt: null,
  predictedEndAt: null,
};

function Page() {
  return useSession().membership === null ? null : <StartScreen />;
}

async function open(options: { armed: boolean; locks?: LockView[] }): Promise<FakeLab> {
  const lab = startFakeLab('operator');
  const rig = {
    id: 'rig-1',
    name: 'North bench',
    revision: 3,
    link: { kind: 'simulated' },
    live,
    arm: options.armed ? arm : null,
    ...{ arming: null, disarmed: null, locks: options.locks ?? [], activeRun: null },
    signatures: [{ userId: 'u1', name: 'Ada Thornfield', version: cautionsVersion, at: '2031-03-01T09:00:00Z' }],
    document: demoRigWide,
    position: null,
    massSets: [{ id: 'm1', label: 'Lead spheres', sources: demoRigWide.sources }],
  };
  lab.on('GET /labs/lab-1/rigs/rig-1', () => ({ body: rig, etag: '"1"' }));
  lab.on('GET /labs/lab-1/protocols', () => ({ body: { items: [summary] } }));
  lab.on('GET /labs/lab-1/protocols/p1', () => ({ body: protocol, etag: '"1"' }));
  lab.on('GET /labs/lab-1/rigs/rig-1/start-checks', () => ({
    body: {
      checks: [
        check('link', 'pass', 'The controller answers.', [
          { name: 'round trip', value: 0.8, unit: 'ms' },
          { name: 'last reply', value: 0.4, unit: 's' },
        ]),
        check('armed', options.armed ? 'pass' : 'fail', 'Arm the rig on site first.'),
      ],
      mayStart: options.armed,
      durationS: 33_060,
      finishAt: '2031-03-14T06:11:00Z',
      firstMove: 'Home: up to 20° at 0.6°/s.',
    },
  }));
  lab.on('POST /labs/lab-1/rigs/rig-1/start-review', () => ({
    status: 201,
    body: {
      token: `token-${lab.requests('POST /labs/lab-1/rigs/rig-1/start-review').length}`,
      expiresAt: '2031-03-13T21:00:30Z',
      serverAt: new Date().toISOString(),
    },
  }));
  params['rigId'] = 'rig-1';
  went.length = 0;
  await showInLab(<Page />);
  await wait(50);
  return lab;
}

const wait = (ms: number) => act(() => jest.advanceTimersByTimeAsync(ms));
beforeEach(() => jest.useFakeTimers({ now: Date.UTC(2031, 2, 13, 21, 0) }));
afterEach(() => jest.useRealTimers());

const startBySwitch = async () => {
  fireEvent.click(screen.getByTestId('start-run-other-way'));
  fireEvent.click(screen.getByTestId('start-run-switch'));
  fireEvent.click(screen.getByTestId('start-run'));
  await wait(50);
};
const sent = (lab: FakeLab) => lab.requests('POST /labs/lab-1/runs');

test('the review names rig, revision, first move, length, finish in lab time and who is on site', async () => {
  await open({ armed: true });
  const words = screen.getByTestId('start-screen').textContent ?? '';
  for (const part of [
    'North bench, revision 3',
    'Overnight reversals, revision 7',
    'Lead spheres',
    'Home: up to 20° at 0.6°/s.',
    '9\u202fh 11\u202fmin',
    '07:11',
    'Fri',
    'Europe/Oslo',
    'Bram Oakhurst',
    'camera glued, do not level',
  ])
    expect(words).toContain(part);
});

test('a start that is not allowed cannot be sent, and what stands against it comes first', async () => {
  const lab = await open({ armed: false });
  expect(screen.getByTestId('start-checks').firstElementChild?.textContent).toContain('Arm the rig on site first.');
  fireEvent.mouseDown(screen.getByTestId('start-run'));
  await wait(3000);
  expect(sent(lab)).toEqual([]);
});

test('each check shows what it has measured just now', async () => {
  await open({ armed: true });
  const words = (screen.getByTestId('check-link').textContent ?? '').replaceAll('\u202f', ' ');
  expect(words).toContain('round trip 0.80 ms');
  expect(words).toContain('last reply 0.4 s');
});

test('a start is sent once, with the time of the tap, and leads to the run', async () => {
  const lab = await open({ armed: true });
  lab.on('POST /labs/lab-1/runs', () => ({ status: 201, body: run }));
  await startBySwitch();
  expect(sent(lab)).toHaveLength(1);
  expect(sent(lab)[0]?.body).toMatchObject({
    rigId: 'rig-1',
    protocolId: 'p1',
    revision: 7,
    massSetId: 'm1',
    tappedAt: expect.stringMatching(/^2031-03-13T21:00:0/),
    reviewToken: 'token-1',
  });
  expect(sent(lab)[0]?.headers.get('idempotency-key')).toMatch(/^[0-9a-f]{32}$/);
  expect(went).toEqual(['/runs/run-1']);
});

test('a refusal is said, and nothing is sent again by itself', async () => {
  const lab = await open({ armed: true });
  lab.on('POST /labs/lab-1/runs', () =>
    problem(409, 'rig-busy', 'North bench is carrying out another run. Wait until it ends, or stop it.'),
  );
  await startBySwitch();
  expect(screen.getByText('North bench is carrying out another run. Wait until it ends, or stop it.')).toBeTruthy();
  await wait(60_000);
  expect(sent(lab)).toHaveLength(1);
  expect(went).toEqual([]);
});

test('on a dead network a start fails at once and is not queued', async () => {
  const lab = await open({ armed: true });
  lab.away = true;
  await startBySwitch();
  lab.away = false;
  await wait(60_000);
  expect(sent(lab)).toEqual([]);
});

test('a personal lock stands large above everything', async () => {
  const since = '2031-03-13T20:40:00Z';
  await open({ armed: false, locks: [{ id: 'l1', userId: 'u7', name: 'Anna Fellstone', note: '', since }] });
  expect(screen.getByTestId('locked-notice').textContent).toBe('Anna Fellstone has hands in the rig. Nothing moves.');
  expect(screen.getByTestId('locked-notice').getAttribute('role')).toBe('alert');
});

test('a review that grows old is made anew, and none is made while nothing may be started', async () => {
  const lab = await open({ armed: true });
  lab.on('POST /labs/lab-1/runs', () => ({ status: 201, body: run }));
  await wait(21_000);
  await startBySwitch();
  expect((sent(lab)[0]?.body as { reviewToken: string }).reviewToken).toBe('token-2');
  expect(lab.requests('POST /labs/lab-1/rigs/rig-1/start-review')[0]?.body).toEqual({ protocolId: 'p1', revision: 7, massSetId: 'm1' });
});
