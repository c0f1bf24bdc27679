import { screen } from '@testing-library/react';
import { useSession } from '@/components/api';
import { RunAlarms } from '@/components/runs/run-alarms';
import type { RunAlarm } from '@/shared/contracts/alarms';
import { showInLab, startFakeLab } from '../support/fake-lab';

const door: RunAlarm = {
  ...{ alarmId: 'a1', occurrence: 1, code: 'interlock', title: 'Interlock or door opened', priority: 'high', rigName: 'North bench' },
  ...{ cause: 'The interlock was opened.', consequence: 'The run is held.', words: 'The door was opened.' },
  ...{ raisedAt: '2031-02-14T22:00:00Z', untilAt: '2031-02-14T22:05:00Z', told: ['Ilse Marrowby', 'Tam Ferrowdale'] },
  seen: { by: 'Tam Ferrowdale', at: '2031-02-14T22:02:00Z' },
  done: { by: 'Tam Ferrowdale', at: '2031-02-14T22:06:00Z', note: 'Shut it.' },
  aside: null,
};

async function show(items: RunAlarm[], rehearsal = false) {
  const lab = startFakeLab('viewer');
  lab.on('GET /labs/lab-1/runs/r1/alarms', () => ({ body: { items } }));
  function Page() {
    if (useSession().membership === null) return null;
    return <RunAlarms runId="r1" startedAt="2031-02-14T20:00:00Z" rehearsal={rehearsal} />;
  }
  await showInLab(<Page />);
  return lab;
}

test('each alarm says what was found, what it means, from when until when, who was told and who saw it', async () => {
  await show([door, { ...door, alarmId: 'a2', priority: 'low', untilAt: null, told: [], seen: null, done: null }]);
  const [first, second] = await screen.findAllByTestId('run-alarm');
  expect(first?.textContent).toMatch(
    /Interlock or door opened23:00:00.*The door was opened.*The run is held.*High priority; until 23:05:00; told Ilse Marrowby, Tam Ferrowdale; seen by Tam Ferrowdale 23:02:00; done by Tam Ferrowdale 23:06:00: Shut it\./,
  );
  expect(second?.textContent).toMatch(/Low priority; still there; nobody was told; seen by nobody\./);
});

test('a quiet night says so; a rehearsal has no alarms and asks for none', async () => {
  await show([]);
  await screen.findByText('No alarm was raised.');
  const lab = await show([door], true);
  expect(lab.requests('GET /labs/lab-1/runs/r1/alarms')).toEqual([]);
});
