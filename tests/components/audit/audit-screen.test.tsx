import { fireEvent, screen, within } from '@testing-library/react';
import { useSession } from '@/components/api';
import { AuditScreen } from '@/components/audit/audit-screen';
import { auditFacts, kindChoices, kindWords } from '@/components/audit/audit-words';
import type { AuditCheck, AuditEntry } from '@/shared/contracts/audit';
import type { Role } from '@/shared/contracts/roles';
import { showInLab, startFakeLab } from '../support/fake-lab';

const whole: AuditCheck = {
  ...{ valid: true, upToSeq: 1234, hash: 'ab'.repeat(32), broken: null, complete: true, checkedAt: '2031-02-14T20:00:00Z' },
  ...{ people: [{ id: 'u1', name: 'Ada Thornfield' }], kinds: ['rig.armed', 'run.hold-asked', 'run.started'] },
};
const entry: AuditEntry = {
  ...{ seq: 1234, at: '2031-02-14T19:59:58.123Z', who: 'Ada Thornfield', kind: 'run.hold-asked', hash: 'ab'.repeat(32) },
  data: { runId: 'r1', reason: 'smoke', who: { id: 'u1', name: 'Ada Thornfield' } },
};

function Page() {
  return useSession().membership === null ? null : <AuditScreen />;
}

async function open(role: Role, check: AuditCheck = whole) {
  const lab = startFakeLab(role);
  lab.on('GET /labs/lab-1/audit-check', () => ({ body: check }));
  lab.on('GET /labs/lab-1/audit', () => ({ body: { items: [entry], next: null } }));
  await showInLab(<Page />);
  return lab;
}

test('an owner reads how far the chain is whole, who did what and when, and opens an entry to see all of it', async () => {
  await open('owner');
  expect((await screen.findByTestId('audit-check')).textContent).toMatch(/whole up to entry 1.?234.*last entry/);
  const row = await screen.findByTestId('audit-entry');
  expect(row.textContent).toMatch(/2031-02-14 20:59:58.*Run: hold asked.*Ada Thornfield.*run r1 · reason smoke/);
  expect(screen.queryByTestId('audit-whole')).toBeNull();
  fireEvent.click(within(row).getByRole('button'));
  expect(screen.getByTestId('audit-whole').textContent).toContain('"reason": "smoke"');
});

test('a broken chain is an alert that names the entry and how far it is right', async () => {
  await open('owner', { ...whole, valid: false, upToSeq: 16, broken: { seq: 17, why: 'event 17 was changed' } });
  expect((await screen.findByRole('alert')).textContent).toMatch(/broken at entry 17.*Event 17 was changed\. It is whole up to entry 16/);
});

test('whoever is no owner is told who may read it, and nothing is asked for', async () => {
  const lab = await open('keeper');
  await screen.findByText(/You are a keeper/);
  expect(lab.requests('GET /labs/lab-1/audit')).toEqual([]);
});

test('acts in words, each under its area', () => {
  expect(kindWords('device-token.made')).toBe('Device token: made');
  expect(kindChoices(whole.kinds).map(({ label }) => label)).toEqual([
    ...['everything', 'Rigs, all', '– Rig: armed', 'Runs, all', '– Run: hold asked', '– Run: started'],
  ]);
  expect(auditFacts({ userId: 'u2', from: 'viewer', to: 'keeper', near: true, note: '', who: {} })).toBe(
    'user u2 · before viewer · after keeper · near yes',
  );
});
