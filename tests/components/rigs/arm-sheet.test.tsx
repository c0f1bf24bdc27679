import { fireEvent, screen } from '@testing-library/react';
import { useSession } from '@/components/api';
import { ArmPanel } from '@/components/rigs/arm-panel';
import type { RigView } from '@/shared/contracts/rigs';
import type { Role } from '@/shared/contracts/roles';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { problem, settled, showInLab, startFakeLab, type FakeLab } from '../support/fake-lab';

const rig: RigView = {
  id: 'rig-1',
  name: 'North bench',
  revision: 1,
  link: { kind: 'simulated' },
  arm: null,
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
    driversOn: true,
  },
};

function Page() {
  return useSession().membership === null ? null : <ArmPanel rig={rig} />;
}

async function open(role: Role): Promise<FakeLab> {
  const lab = startFakeLab(role);
  await showInLab(<Page />);
  return lab;
}

const press = (testId: string) => fireEvent.click(screen.getByTestId(testId));

test('arming needs a name, presence and the cautions, and sends an end 16 h ahead', async () => {
  const lab = await open('operator');
  const begin = Date.now();
  lab.on('POST /labs/lab-1/rigs/rig-1/arm', ({ body }) => ({
    status: 201,
    body: { id: 'arm-1', name: 'Ada Thornfield', from: '2031-03-13T20:00:00Z', until: (body as { until: string }).until, note: '' },
  }));
  press('arm');
  expect(screen.getByTestId('arm-confirm')).toHaveProperty('disabled', true);
  press('arm-on-site');
  expect(screen.getByTestId('arm-confirm')).toHaveProperty('disabled', true);
  press('arm-cautions');
  press('arm-confirm');
  await settled();
  const sent = lab.requests('POST /labs/lab-1/rigs/rig-1/arm')[0]?.body as { name: string; until: string; cautionsRead: boolean };
  expect(sent).toMatchObject({ name: 'Ada Thornfield', cautionsRead: true });
  expect((Date.parse(sent.until) - begin) / 3_600_000).toBeCloseTo(16, 1);
  expect(screen.queryByTestId('arm-sheet')).toBeNull();
});

test('every caution of the lab stands on the sheet', async () => {
  await open('keeper');
  press('arm');
  const words = screen.getByTestId('arm-sheet').textContent ?? '';
  for (const needed of ['Heavy masses', 'Lead', 'IEC 60825-1', 'Belt', 'Mains', 'ISO 13850', 'no emergency stop'])
    expect(words).toContain(needed);
});

test('a refusal is said and nothing typed is lost', async () => {
  const lab = await open('operator');
  lab.on('POST /labs/lab-1/rigs/rig-1/arm', () => problem(409, 'not-ready', 'The interlock is open. Close the door, then arm.'));
  press('arm');
  fireEvent.change(screen.getByLabelText('Note for whoever starts a run'), { target: { value: 'do not level' } });
  press('arm-on-site');
  press('arm-cautions');
  press('arm-confirm');
  await screen.findByText('The interlock is open. Close the door, then arm.');
  expect(screen.getByLabelText('Note for whoever starts a run')).toHaveProperty('value', 'do not level');
});

test.each(['analyst', 'viewer'] as const)('a %s is told who may arm instead of being offered it', async (role) => {
  await open(role);
  expect(screen.queryByTestId('arm')).toBeNull();
  expect(screen.getByText(/Only an operator, a keeper or an owner may arm a rig\./)).toBeTruthy();
});
