import { fireEvent, screen } from '@testing-library/react';
import { useSession } from '@/components/api';
import { FirstMoveScreen } from '@/components/link/first-move-screen';
import type { GuidedView, LineMessage } from '@/shared/contracts/link';
import type { Role } from '@/shared/contracts/roles';
import { cautionsVersion } from '@/shared/rig/cautions';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument, RigMotion } from '@/shared/rig/document';
import { params } from '../support/fake-router';
import { problem, settled, showInLab, startFakeLab, type FakeLab } from '../support/fake-lab';
import { startFakeStream, type FakeStream } from '../support/fake-stream';

const path = '/labs/lab-1/rigs/rig-1';
const at = '2031-03-14T20:00:00.000Z';
const arm = { id: 'arm-1', name: 'Ada Thornfield', from: at, until: '2031-03-15T12:00:00.000Z', note: '' };
const live = {
  ...{
    condition: 'ready',
    detail: '',
    lastReplyAt: at,
    roundTripMs: 2,
    discardedLines: 0,
    positionKnown: true,
    angleDeg: 0,
    moving: false,
  },
  ...{ interlockClosed: true, supplyPresent: true, armKey: true, driversOn: true },
};
const rig = {
  ...{ id: 'rig-1', name: 'North bench', revision: 3, link: { kind: 'simulated' }, live, arm, activeRun: null },
  ...{ arming: null, disarmed: null, locks: [], signatures: [{ userId: 'u1', name: 'Ada Thornfield', version: cautionsVersion, at }] },
  ...{ document: demoRigWide, massSets: [], position: null },
};
const controller = {
  ...{ bootId: '0000AB01', firmware: 'evenfall-0.1', positionKnown: true, angleDeg: 0, moving: false, interlockClosed: true },
  ...{ supplyPresent: true, armKey: true, driversOn: true, homeFlagCovered: false, leaseLive: false, warningDue: false },
};
const guided: GuidedView = {
  ...{ id: 'g-1', by: { id: 'u1', name: 'Ada Thornfield' }, since: at, present: true, whyNot: '', order: null },
  ...{ count: { number: 1, steps: 0 }, edges: [], longestNudgeSteps: 433 },
};
const figures = {
  roundTripP50Ms: 2,
  roundTripP95Ms: 3,
  discardedBytes: 0,
  keptOutBy: null,
  droppedByController: 0,
  retries: 0,
  drift: null,
  protocol: '1.0',
};
let beat = 0;
const line = (change: object = {}): LineMessage =>
  ({
    ...{ serverAt: at, beat: (beat += 1), link: { kind: 'simulated' } },
    health: {
      ...figures,
      condition: 'ready',
      detail: '',
      lastReplyAt: at,
      roundTripMs: 2.1,
      discardedLines: 0,
      reconnects: 0,
      clock: { offsetMs: 12, uMs: 0.2 },
    },
    ...{ controller, arm, arming: null, disarmed: null, locks: [], takenBy: null, guided: null, halt: null },
    limits: { minDeg: -81, maxDeg: 81, maxSpeed_deg_s: 4.5, maxAcceleration_deg_s2: 4.5, homeSpeed_deg_s: 2.25 },
    ...change,
  }) as LineMessage;
const done = (steps: number, count = steps) => ({
  guided: { ...guided, order: { id: 'o', at, kind: 'nudge', steps, state: 'done', detail: '' }, count: { number: 1, steps: count } },
});

function Page() {
  return useSession().membership === null ? null : <FirstMoveScreen />;
}

let lab: FakeLab;
let stream: FakeStream;
async function open(role: Role = 'keeper', first: object = {}, document: RigDocument = demoRigWide): Promise<void> {
  lab = startFakeLab(role);
  stream = startFakeStream();
  lab.on(`GET ${path}`, () => ({ body: { ...rig, document }, etag: '"3-abc"' }));
  for (const name of ['nudge', 'home']) lab.on(`POST ${path}/guided/${name}`, () => ({ status: 202, body: guided }));
  lab.on(`POST ${path}/guided/stay`, () => ({ status: 204 }));
  lab.on(`POST ${path}/guided/end`, () => ({ status: 204 }));
  params['rigId'] = 'rig-1';
  await showInLab(<Page />);
  await screen.findByText('First move of North bench');
  stream.say('line', line(first));
  await settled();
}
const type = (id: string, value: string) => fireEvent.change(screen.getByTestId(id), { target: { value } });
const press = async (id: string) => {
  fireEvent.click(screen.getByTestId(id));
  await settled();
};

test('nothing begins before the cautions are read and everything holds that must', async () => {
  await open('keeper', { controller: { ...controller, armKey: false }, arm: null });
  expect(screen.getByText('Heavy masses')).toBeTruthy();
  expect(screen.getByTestId('conditions').textContent).toContain('The arm key on the controller is on: not yet');
  await press('first-move-read');
  expect(screen.getByTestId('begin-guided')).toHaveProperty('disabled', true);
  stream.say('line', line());
  expect(screen.getByTestId('begin-guided')).toHaveProperty('disabled', false);
  lab.on(`POST ${path}/guided`, () => problem(409, 'not-armed', 'North bench is not armed.'));
  await press('begin-guided');
  await screen.findByText('North bench is not armed.');
  expect(lab.requests(`POST ${path}/guided`)[0]?.body).toEqual({ atTheRig: true });
});

test('a viewer sees the conditions and is told who may move the rig', async () => {
  await open('viewer');
  expect(screen.queryByTestId('begin-guided')).toBeNull();
  expect(screen.getByTestId('stop')).toHaveProperty('disabled', false);
});

test('the page answers each beat once, and not when it is hidden', async () => {
  await open('keeper', { guided });
  expect(lab.requests(`POST ${path}/guided/stay`).map(({ body }) => body)).toEqual([{ guidedId: 'g-1', beat }]);
  const hidden = jest.spyOn(document, 'visibilityState', 'get').mockReturnValue('hidden');
  stream.say('line', line({ guided }));
  await settled();
  expect(lab.requests(`POST ${path}/guided/stay`)).toHaveLength(1);
  hidden.mockRestore();
});

test('the direction is asked after a nudge, and a wrong one says what to do and opens nothing', async () => {
  await open('keeper', { guided });
  await press('nudge-ccw');
  expect(lab.requests(`POST ${path}/guided/nudge`)[0]?.body).toMatchObject({ guidedId: 'g-1', steps: 8, intoKeepOut: false });
  stream.say('line', line(done(8)));
  await press('turned-cw');
  expect(screen.getByTestId('direction-answer').textContent).toContain('Swap the two wires of one coil');
  fireEvent.click(screen.getByText('3 Travel'));
  expect(screen.getByTestId('direction-first')).toBeTruthy();
  fireEvent.click(screen.getByText('1 Direction'));
  // a clockwise nudge that turns clockwise is right as well
  stream.say('line', line(done(-8)));
  await press('turned-cw');
  expect(screen.getByTestId('direction-answer').textContent).toContain('Right');
});

async function directionKnown(): Promise<void> {
  await open('keeper', done(8));
  await press('turned-ccw');
}

test('steps per degree come from a marked turn with their uncertainty and make a revision', async () => {
  await directionKnown();
  await press('to-steps');
  await press('mark-here');
  stream.say('line', line(done(400, 408)));
  expect(screen.getByTestId('turned-steps').textContent).toContain('400');
  type('turned-deg', '8,91');
  type('turned-u', '0');
  expect(screen.getByTestId('turn-entry').textContent).toContain('it is more than 0');
  type('turned-u', '0.05');
  await press('take-turn');
  // 400 / 8.91 = 44.893…, u = 44.893 · 0.05 / 8.91 = 0.25
  expect(screen.getByTestId('steps-per-degree').textContent?.replace(/[\u2009\u202f]/g, '')).toContain('44.89(25)');
  expect(screen.getByTestId('steps-comparison').textContent).toContain('They agree');
  lab.on(`PUT ${path}/document`, () => problem(412, 'edited-meanwhile', 'Somebody was faster.'));
  await press('revise-steps');
  await screen.findByText('Somebody was faster.');
  const [asked] = lab.requests(`PUT ${path}/document`);
  expect(asked?.headers.get('if-match')).toBe('"3-abc"');
  expect(asked?.body).toMatchObject({ document: { motion: { stepsPerDegree: 44.89 } }, reason: expect.stringContaining('from one turn') });
  expect(screen.getByTestId('steps-per-degree')).toBeTruthy();
});

test('a turn whose count was lost has to be begun anew', async () => {
  await directionKnown();
  await press('to-steps');
  await press('mark-here');
  stream.say('line', line({ guided: { ...guided, count: { number: 2, steps: 0 } } }));
  expect(screen.getByText(/Nobody knows how far the table went/)).toBeTruthy();
  expect(screen.queryByTestId('turn-entry')).toBeNull();
});

test('travel is taught at both ends, with the margin, the stations out of reach and the arc outside', async () => {
  await directionKnown();
  fireEvent.click(screen.getByText('3 Travel'));
  const standAt = (angleDeg: number) => stream.say('line', line({ ...done(8), controller: { ...controller, angleDeg } }));
  standAt(-60);
  await press('this-is-least');
  standAt(62.5);
  await press('this-is-greatest');
  expect(screen.getByTestId('taught-limits').textContent).toBe('−58.00° to 60.50°');
  expect(screen.getByText(/so that no run could go there: clear \(90°\)/)).toBeTruthy();
  type('margin-deg', '-1');
  expect(screen.queryByTestId('revise-travel')).toBeNull();
  expect(screen.getByText('The margin is a number of degrees, 0 or more.')).toBeTruthy();
  type('margin-deg', '2');
  lab.on(`PUT ${path}/document`, () => ({ body: { ...rig, revision: 4 } }));
  await press('revise-travel');
  expect(lab.requests(`PUT ${path}/document`)[0]?.body).toMatchObject({
    document: { motion: { minDeg: -58, maxDeg: 60.5, keepOut: [[-117.5, -60]] } },
    reason: expect.stringContaining('ends at −60.00° and 62.50°, margin 2°'),
  });
  // and on to writing them
  expect(screen.getByTestId('limit-rows').textContent).toContain('least angle');
  lab.on(`POST ${path}/guided/teach`, () => problem(409, 'not-ready', 'The arm key is off.'));
  await press('teach');
  await screen.findByText('The arm key is off.');
});

test('a broken stream takes the orders away and leaves hold and stop', async () => {
  await open('keeper', { guided });
  expect(screen.getByTestId('nudge-ccw')).toHaveProperty('disabled', false);
  stream.breaks();
  expect(screen.getByTestId('nudge-ccw')).toHaveProperty('disabled', true);
  expect(screen.getByTestId('why-not').textContent).toContain('lost the server');
  lab.on(`POST ${path}/stop`, () => ({ status: 202, body: { rigId: 'rig-1', serverAt: at } }));
  await press('stop');
  expect(lab.requests(`POST ${path}/stop`)).toHaveLength(1);
});

test('a nudge towards a keep-out arc wants to be meant, and one that is too long is none', async () => {
  await open('keeper', { guided }, { ...demoRigWide, motion: { ...(demoRigWide.motion as RigMotion), keepOut: [[1, 40]] } });
  expect(screen.queryByTestId('into-keep-out')).toBeNull();
  type('nudge-steps', '100');
  await press('into-keep-out');
  await press('nudge-ccw');
  expect(lab.requests(`POST ${path}/guided/nudge`)[0]?.body).toMatchObject({ steps: 100, intoKeepOut: true });
  type('nudge-steps', '434');
  expect(screen.getByTestId('nudge-pad').textContent).toContain('a whole number from 1 to 433');
  expect(screen.getByTestId('nudge-cw')).toHaveProperty('disabled', true);
});

test('homing that might turn the wrong way wants to be meant', async () => {
  const motion = { ...(demoRigWide.motion as RigMotion), keepOut: [[100, 110]] as [number, number][] };
  await open('keeper', { ...done(8), controller: { ...controller, positionKnown: false, angleDeg: null } }, { ...demoRigWide, motion });
  await press('turned-ccw');
  fireEvent.click(screen.getByText('3 Travel'));
  expect(screen.getByTestId('homing-obstacle').textContent).toContain('its travel is not free: it meets the keep-out arc 100° to 110°');
  expect(screen.getByTestId('home')).toHaveProperty('disabled', true);
  await press('home-all-the-same');
  await press('home');
  expect(lab.requests(`POST ${path}/guided/home`)[0]?.body).toMatchObject({ intoKeepOut: true });
});
