import { fireEvent, screen, waitFor } from '@testing-library/react';
import { useSession } from '@/components/api';
import { LinkScreen } from '@/components/rigs/link-screen';
import type { LinkSettings } from '@/shared/contracts/rigs';
import type { Role } from '@/shared/contracts/roles';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { params, went } from '../support/fake-router';
import { startFakeStream } from '../support/fake-stream';
import { problem, settled, showInLab, startFakeLab, type FakeLab } from '../support/fake-lab';

const live = {
  condition: 'closed',
  detail: '',
  lastReplyAt: null,
  roundTripMs: null,
  discardedLines: 0,
  positionKnown: false,
  angleDeg: null,
  moving: false,
  interlockClosed: null,
  supplyPresent: null,
  armKey: null,
  driversOn: null,
};
const rig = {
  id: 'rig-1',
  name: 'North bench',
  revision: 1,
  link: { kind: 'simulated' },
  live,
  arm: null,
  arming: null,
  disarmed: null,
  locks: [],
  signatures: [],
  activeRun: null,
  document: demoRigWide,
  massSets: [],
  position: null,
};

function Page() {
  return useSession().membership === null ? null : <LinkScreen />;
}

beforeEach(() => startFakeStream());

async function open(role: Role, link: LinkSettings = { kind: 'simulated' }): Promise<FakeLab> {
  const lab = startFakeLab(role);
  lab.on('GET /labs/lab-1/rigs/rig-1', () => ({ body: { ...rig, link }, etag: '"1"' }));
  params['rigId'] = 'rig-1';
  went.length = 0;
  await showInLab(<Page />);
  await screen.findByText('Link of North bench');
  await settled();
  return lab;
}

test('a port that does not answer is said in a sentence, and what was typed stays', async () => {
  const lab = await open('keeper');
  lab.on('POST /labs/lab-1/rigs/rig-1/link/try', () => ({
    body: { ok: false, detail: 'Nothing answered on /dev/pts/9 within 2 s.', firmware: null },
  }));
  fireEvent.click(screen.getByText('Serial line'));
  fireEvent.change(screen.getByTestId('link-path'), { target: { value: '/dev/pts/9' } });
  fireEvent.click(screen.getByTestId('try-link'));
  await screen.findByText('Nothing answered on /dev/pts/9 within 2 s.');
  expect(lab.requests('POST /labs/lab-1/rigs/rig-1/link/try')[0]?.body).toEqual({ kind: 'serial', path: '/dev/pts/9', baudRate: 115_200 });
  expect(screen.getByTestId('link-path')).toHaveProperty('value', '/dev/pts/9');
});

test('the chosen line is stored and leads back to the rig', async () => {
  const lab = await open('keeper');
  lab.on('PUT /labs/lab-1/rigs/rig-1/link', () => ({ body: rig }));
  fireEvent.click(screen.getByTestId('save-link'));
  await screen.findByText(/is now reached over Simulated controller/);
  expect(lab.requests('PUT /labs/lab-1/rigs/rig-1/link')[0]?.body).toEqual({ kind: 'simulated' });
  expect(went).toEqual(['/rigs/rig-1']);
});

test('another speed leaves the levels of the control lines and the device as they were; another path is another device', async () => {
  const usb = { vendorId: '2341', productId: '0043', serialNumber: '5573132' };
  const link: LinkSettings = { kind: 'serial', path: '/dev/ttyUSB0', baudRate: 115_200, dtr: false, rts: true, usb };
  const lab = await open('keeper', link);
  lab.on('PUT /labs/lab-1/rigs/rig-1/link', () => ({ body: rig }));
  const saved = () => lab.requests('PUT /labs/lab-1/rigs/rig-1/link').at(-1)?.body;
  fireEvent.change(screen.getByTestId('link-baud'), { target: { value: '57600' } });
  fireEvent.click(screen.getByTestId('save-link'));
  await waitFor(() => expect(saved()).toEqual({ ...link, baudRate: 57_600 }));
  fireEvent.change(screen.getByTestId('link-path'), { target: { value: '/dev/ttyUSB1' } });
  fireEvent.click(screen.getByTestId('save-link'));
  await waitFor(() => expect(saved()).toEqual({ kind: 'serial', path: '/dev/ttyUSB1', baudRate: 57_600, dtr: false, rts: true }));
});

test('a line that this version does not open is refused in words at the page', async () => {
  const lab = await open('owner');
  lab.on('POST /labs/lab-1/rigs/rig-1/link/try', () =>
    problem(422, 'not-yet', 'Only simulated and pseudo-terminal links are opened in this version.'),
  );
  fireEvent.click(screen.getByText('Serial line'));
  fireEvent.change(screen.getByTestId('link-path'), { target: { value: '/dev/ttyUSB0' } });
  fireEvent.click(screen.getByTestId('try-link'));
  await screen.findByText('Only simulated and pseudo-terminal links are opened in this version.');
});

test('an operator is told who may change the link', async () => {
  await open('operator');
  expect(screen.queryByTestId('save-link')).toBeNull();
  expect(screen.getByText(/Only a keeper or an owner may change a rig\./)).toBeTruthy();
});

test('a port of the server is chosen with a tap, under the name that stays and with the device that it is', async () => {
  const usb = { vendorId: '2341', productId: '0043', serialNumber: '75330' };
  const stablePath = '/dev/serial/by-id/usb-board-75330';
  const lab = await open('keeper');
  const ports = [{ path: '/dev/ttyACM0', stablePath, label: 'A board', usb, usedBy: null }];
  lab.on('GET /labs/lab-1/serial-ports', () => ({ body: { items: ports } }));
  lab.on('POST /labs/lab-1/rigs/rig-1/link/try', () => ({ body: { ok: true, detail: 'A controller answers.', firmware: 'evenfall-0.1' } }));
  fireEvent.click(screen.getByText('Serial line'));
  await waitFor(() => expect(screen.getByTestId('port-list').textContent).toContain('A board · USB 75330 · free'));
  fireEvent.click(screen.getByTestId('port-/dev/ttyACM0'));
  expect(screen.getByTestId('link-path')).toHaveProperty('value', stablePath);
  fireEvent.click(screen.getByTestId('try-link'));
  await screen.findByText(/A controller answers\./);
  expect(lab.requests('POST /labs/lab-1/rigs/rig-1/link/try')[0]?.body).toEqual({
    kind: 'serial',
    path: stablePath,
    baudRate: 115_200,
    usb,
  });
});

test.each([
  ['link-baud', 'fast', 'Serial line', 'a whole number from 300 to 1000000 is needed'],
  ['link-baud', '9600.5', 'Serial line', 'a whole number from 300 to 1000000 is needed'],
  ['link-path', `/dev/${'x'.repeat(300)}`, 'Serial line', 'a path of at most 300 characters is needed'],
  ['link-port', 'telnet', 'Network', 'a whole number from 1 to 65535 is needed'],
  ['link-port', '70000', 'Network', 'a whole number from 1 to 65535 is needed'],
  ['link-host', '10.0.0.4:4001', 'Network', 'without a port'],
])('%s "%s" is neither tried nor used: the page says what would be right, and keeps it', async (field, typed, kind, words) => {
  await open('keeper');
  fireEvent.click(screen.getByText(kind));
  const right = { 'link-path': '/dev/ttyUSB0', 'link-host': '10.0.0.4', 'link-port': '4001', 'link-baud': '9600' };
  for (const [name, value] of Object.entries(right)) {
    const place = screen.queryByTestId(name);
    if (place !== null) fireEvent.change(place, { target: { value } });
  }
  expect(screen.getByTestId('save-link').getAttribute('aria-disabled')).toBeNull();
  fireEvent.change(screen.getByTestId(field), { target: { value: typed } });
  expect(screen.getByText(new RegExp(words))).toBeTruthy();
  expect(screen.getByTestId(field)).toHaveProperty('value', typed);
  for (const act of ['try-link', 'save-link']) expect(screen.getByTestId(act).getAttribute('aria-disabled')).toBe('true');
});
