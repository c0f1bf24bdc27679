import { fireEvent, screen } from '@testing-library/react';
import { useSession } from '@/components/api';
import { ArmPanel } from '@/components/rigs/arm-panel';
import type { RigView } from '@/shared/contracts/rigs';
import type { Role } from '@/shared/contracts/roles';
import { cautionsVersion } from '@/shared/rig/cautions';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { problem, settled, showInLab, startFakeLab, type FakeLab } from '../support/fake-lab';

const rig: RigView = {
  id: 'rig-1',
  name: 'North bench',
  revision: 1,
  link: { kind: 'simulated' },
  arm: null,
  arming: null,
  disarmed: null,
  locks: [],
  signatures: [],
  activeRun: null,
  position: null,
  document: demoRigWide,
  massSets: [],
  live: {
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
  },
};

const signature = { userId: 'u1', name: 'Ada Thornfield', version: cautionsVersion, at: '2031-03-01T09:00:00Z' };

function Page({ shown }: { shown: RigView }) {
  return useSession().membership === null ? null : <ArmPanel rig={shown} />;
}

async function open(role: Role, change: Partial<RigView> = { signatures: [signature] }): Promise<FakeLab> {
  const lab = startFakeLab(role);
  await showInLab(<Page shown={{ ...rig, ...change }} />);
  return lab;
}

const press = (testId: string) => fireEvent.click(screen.getByTestId(testId));
const path = '/labs/lab-1/rigs/rig-1';

test('arming needs a name and presence, and asks for an end 16 h ahead; the rest happens at the rig', async () => {
  const lab = await open('operator');
  const begin = Date.now();
  lab.on(`POST ${path}/arm`, ({ body }) => ({
    status: 202,
    body: { name: 'Ada Thornfield', until: (body as { until: string }).until, stage: 'key-on', endsAt: '2031-03-13T20:10:00Z' },
  }));
  press('arm');
  expect(screen.getByTestId('arm-confirm')).toHaveProperty('disabled', true);
  press('arm-on-site');
  press('arm-confirm');
  await settled();
  const sent = lab.requests(`POST ${path}/arm`)[0]?.body as { name: string; until: string };
  expect(sent).toMatchObject({ name: 'Ada Thornfield' });
  expect((Date.parse(sent.until) - begin) / 3_600_000).toBeCloseTo(16, 1);
  expect(screen.queryByTestId('arm-sheet')).toBeNull();
});

test('who has not signed the cautions signs them on the sheet, in the version that is read', async () => {
  const lab = await open('keeper', { signatures: [{ ...signature, version: cautionsVersion - 1 }] });
  lab.on(`POST ${path}/cautions`, () => ({ status: 201, body: signature }));
  press('arm');
  const words = screen.getByTestId('arm-sheet').textContent ?? '';
  for (const needed of ['Heavy masses', 'Lead', 'IEC 60825-1', 'Belt', 'Mains', 'ISO 13850', 'no emergency stop'])
    expect(words).toContain(needed);
  press('arm-on-site');
  expect(screen.getByTestId('arm-confirm')).toHaveProperty('disabled', true);
  press('sign-cautions');
  await settled();
  expect(lab.requests(`POST ${path}/cautions`)[0]?.body).toEqual({ version: cautionsVersion });
});

test('a signature is shown with its date and the version of the words', async () => {
  await open('keeper');
  press('arm');
  expect(screen.getByTestId('cautions-signed').textContent).toMatch(
    /Signed by Ada Thornfield for this rig, 2031-03-01 10:00, Europe\/Oslo, version \d+/,
  );
});

test('a refusal is said and nothing typed is lost', async () => {
  const lab = await open('operator');
  lab.on(`POST ${path}/arm`, () => problem(409, 'not-ready', 'The motor supply of North bench is off. Switch it on at the rig, then arm.'));
  press('arm');
  fireEvent.change(screen.getByLabelText('Note for whoever starts a run'), { target: { value: 'do not level' } });
  press('arm-on-site');
  press('arm-confirm');
  await screen.findByText('The motor supply of North bench is off. Switch it on at the rig, then arm.');
  expect(screen.getByLabelText('Note for whoever starts a run')).toHaveProperty('value', 'do not level');
});

test.each(['analyst', 'viewer'] as const)('a %s is told who may arm instead of being offered it', async (role) => {
  await open(role, {});
  expect(screen.queryByTestId('arm')).toBeNull();
  expect(screen.queryByTestId('virtual-inputs')).toBeNull();
  expect(screen.getByText(/Only an operator, a keeper or an owner may arm a rig\./)).toBeTruthy();
});

test('while somebody arms, the next thing to do at the rig and the time left are said', async () => {
  const endsAt = new Date(Date.now() + 90_000).toISOString();
  const arming = { name: 'Ada Thornfield', until: '2031-03-14T12:00:00Z', stage: 'leave', endsAt } as const;
  await open('operator', { arming, live: { ...rig.live, interlockClosed: false } });
  const words = screen.getByTestId('arming').textContent ?? '';
  expect(words).toContain('Leave the room and close the door');
  expect(words).toContain('The door is open now.');
  expect(screen.getByTestId('arming-left').textContent).toMatch(/^1:(29|30)$/);
  expect(screen.queryByTestId('arm')).toBeNull();
});

test('a rig that is not armed any more says why', async () => {
  await open('viewer', { disarmed: { name: 'Ada Thornfield', why: 'the interlock was opened', at: '2031-03-13T23:14:00Z' } });
  expect(screen.getByTestId('disarmed').textContent).toMatch(/Not armed since .*00:14.*\(Ada Thornfield\): the interlock was opened\./);
});

test('only a rig that is part of the server has a virtual key and door', async () => {
  await open('operator', { link: { kind: 'serial', path: '/dev/null', baudRate: 115_200 } });
  expect(screen.queryByTestId('virtual-inputs')).toBeNull();
});
