import { fireEvent, screen } from '@testing-library/react';
import { useSession } from '@/components/api';
import { QuarantineScreen } from '@/components/runs/quarantine-screen';
import type { RunView } from '@/shared/contracts/runs';
import type { Role } from '@/shared/contracts/roles';
import { nowUtcMs, viewAt } from '../fixtures/run';
import { problem, settled, showInLab, startFakeLab, type FakeLab } from '../support/fake-lab';

/** A run that the server found and cannot carry on: nothing on its page looks alive, and it says what can be done. */

type Quarantine = NonNullable<RunView['quarantine']>;
const otherVersion: Quarantine = {
  cause: 'other-version',
  why: 'The run was saved by another version of the run engine (99; this one reads 7). Look at the rig, then end the run.',
};
const refresh = jest.fn();
const stop = 'POST /labs/lab-1/runs/run-1/stop';
const accepted = { status: 202, body: { runId: 'run-1', serverAt: '2031-03-14T02:00:00Z' } };

function Page({ quarantine }: { quarantine: Quarantine }) {
  const view = viewAt(nowUtcMs, { quarantine });
  return useSession().membership === null ? null : <QuarantineScreen view={view} quarantine={quarantine} beat={null} refresh={refresh} />;
}

async function open(role: Role, quarantine: Quarantine = otherVersion): Promise<FakeLab> {
  refresh.mockClear();
  const lab = startFakeLab(role);
  await showInLab(<Page quarantine={quarantine} />);
  return lab;
}

const text = () => screen.getByTestId('quarantine-screen').textContent ?? '';
const press = (testId: string) => fireEvent.click(screen.getByTestId(testId));

test('it says what happened, that nothing moves and where the switch is, and shows neither a countdown nor hold, resume and stop', async () => {
  await open('operator');
  expect(screen.getByRole('alert').textContent).toContain('This run cannot be carried on. Nobody drives the rig.');
  expect(screen.getByTestId('quarantine-why').textContent).toBe(otherVersion.why);
  expect(text()).toMatch(/Nothing moves\..*use the switch at the rig/);
  for (const alive of ['time-left', 'control-bar', 'hold', 'stop', 'resume', 'link-chip']) expect(screen.queryByTestId(alive)).toBeNull();
});

test.each([
  ['other-version', /start the version of the server that wrote it/],
  ['no-link', /set up the link of the rig, then start the server again/],
  ['broken', /put right what is said above, then start the server again/],
] as const)('what lets a run go on that is set aside for %s', async (cause, words) => {
  await open('operator', { cause, why: 'It is so.' });
  expect(text()).toMatch(words);
});

test('what the text says is what the button says, and one act more ends the run', async () => {
  const lab = await open('operator');
  lab.on(stop, () => accepted);
  const words = screen.getByTestId('end-run').textContent ?? '';
  expect(words).toBe('End the run');
  expect(otherVersion.why.toLowerCase()).toContain(words.toLowerCase());
  press('end-run');
  expect(lab.requests(stop)).toHaveLength(0);
  expect(screen.getByTestId('end-run-confirm').textContent).toBe(words);
  press('end-run-confirm');
  await settled();
  expect(lab.requests(stop)).toHaveLength(1);
  expect(refresh).toHaveBeenCalledTimes(1);
  expect(screen.queryByTestId('end-run-sheet')).toBeNull();
});

test('an end that is refused is said with its reason, and the run is not shown as ended', async () => {
  const lab = await open('operator');
  lab.on(stop, () => problem(503, 'database-away', 'The database does not answer.'));
  press('end-run');
  press('end-run-confirm');
  await settled();
  expect(screen.getByTestId('end-run-sheet').textContent).toContain('The database does not answer.');
  expect(refresh).not.toHaveBeenCalled();
});
