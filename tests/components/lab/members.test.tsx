import { fireEvent, screen } from '@testing-library/react';
import userEvent from '@testing-library/user-event';
import { useSession } from '@/components/api';
import { Members } from '@/components/lab/members';
import type { Role } from '@/shared/contracts/roles';
import { problem, showInLab, startFakeLab, type FakeLab } from '../support/fake-lab';

const people = [
  { userId: 'u1', name: 'Ada Thornfield', email: 'ada@quillfen.example', role: 'owner', since: '2030-01-01T00:00:00Z' },
  { userId: 'u2', name: 'Bram Oakhurst', email: 'bram@quillfen.example', role: 'keeper', since: '2030-01-01T00:00:00Z' },
];

function Page() {
  return useSession().membership === null ? null : <Members />;
}

async function open(role: Role): Promise<FakeLab> {
  const lab = startFakeLab(role);
  lab.on('GET /labs/lab-1/members', () => ({ body: { members: people, invitations: [] } }));
  await showInLab(<Page />);
  await screen.findByText('Bram Oakhurst');
  return lab;
}

test('an owner invites by e-mail into a role; a refusal stands at its field and the address stays', async () => {
  const lab = await open('owner');
  lab.on('POST /labs/lab-1/invitations', () =>
    problem(409, 'already-exists', {
      detail: 'Bram is a member already.',
      errors: [{ path: 'email', message: 'bram@quillfen.example is a member already' }],
    }),
  );
  fireEvent.click(screen.getByTestId('invite'));
  await userEvent.type(screen.getByLabelText('E-mail'), 'bram@quillfen.example');
  fireEvent.click(screen.getByText('Send the invitation'));
  await screen.findByText('bram@quillfen.example is a member already');
  expect(lab.requests('POST /labs/lab-1/invitations')[0]?.body).toEqual({ email: 'bram@quillfen.example', role: 'operator' });
  expect(screen.getByLabelText('E-mail')).toHaveProperty('value', 'bram@quillfen.example');
});

test('an address that is none is refused before anything is sent', async () => {
  const lab = await open('owner');
  fireEvent.click(screen.getByTestId('invite'));
  await userEvent.type(screen.getByLabelText('E-mail'), 'bram');
  fireEvent.click(screen.getByText('Send the invitation'));
  await screen.findByRole('alert');
  expect(lab.requests('POST /labs/lab-1/invitations')).toEqual([]);
});

test('removing a member takes two presses', async () => {
  const lab = await open('owner');
  lab.on('DELETE /labs/lab-1/members/u2', () => ({ status: 204 }));
  fireEvent.click(screen.getByLabelText(/^Bram Oakhurst, keeper/));
  fireEvent.click(screen.getByText('Remove from the lab'));
  expect(lab.requests('DELETE /labs/lab-1/members/u2')).toEqual([]);
  fireEvent.click(screen.getByText('Remove Bram Oakhurst'));
  await screen.findByText('Bram Oakhurst is no longer a member.');
});

test.each(['keeper', 'operator', 'analyst', 'viewer'] as const)('a %s sees the members and is told who manages them', async (role) => {
  await open(role);
  expect(screen.queryByTestId('invite')).toBeNull();
  expect(screen.getByText(/^Only an owner may manage members\./)).toBeTruthy();
});
