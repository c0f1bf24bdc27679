import { fireEvent, screen, waitFor } from '@testing-library/react';
import userEvent from '@testing-library/user-event';
import { useState } from 'react';
import { useLabCall, useSession } from '@/components/api';
import { SignInAgain } from '@/components/people/sign-in-again';
import { getLab } from '@/shared/contracts/people';
import { memberAs, problem, settled, showInLab, startFakeLab, type FakeLab } from '../support/fake-lab';

let lab: FakeLab;
beforeEach(() => {
  lab = startFakeLab('operator');
});

function Page() {
  const { state } = useSession();
  return state.kind === 'signed-in' || state.kind === 'expired' ? <Note /> : <p>{state.kind}</p>;
}

function Note() {
  const [text, setText] = useState('');
  const ask = useLabCall(getLab);
  return (
    <>
      <textarea aria-label="note" value={text} onChange={(event) => setText(event.target.value)} />
      <button onClick={() => void ask().catch(() => undefined)}>ask</button>
      <SignInAgain />
    </>
  );
}

async function expireInMidEdit() {
  await showInLab(<Page />);
  fireEvent.change(screen.getByLabelText('note'), { target: { value: 'camera glued' } });
  lab.on('GET /labs/lab-1', () => problem(401, 'session-expired', 'Your session has ended. Sign in again.'));
  fireEvent.click(screen.getByText('ask'));
  await settled();
}

test('an expired session asks for the password over the page, and what was typed stays', async () => {
  await expireInMidEdit();
  expect(screen.getByTestId('sign-in-again')).toBeTruthy();
  expect(screen.getByLabelText('note')).toHaveProperty('value', 'camera glued');
  expect(screen.getByLabelText('E-mail')).toHaveProperty('value', 'ada@quillfen.example');

  lab.on('POST /session', () => ({ body: memberAs('operator') }));
  await userEvent.type(screen.getByLabelText('Password'), 'a long enough password');
  fireEvent.click(screen.getByTestId('sign-in'));
  await waitFor(() => expect(screen.queryByTestId('sign-in-again')).toBeNull());
  expect(screen.getByLabelText('note')).toHaveProperty('value', 'camera glued');
});

test('a wrong password is said, and neither address nor password is wiped', async () => {
  await expireInMidEdit();
  lab.on('POST /session', () => problem(401, 'wrong-credentials', 'E-mail or password is wrong. Check both.'));
  await userEvent.type(screen.getByLabelText('Password'), 'not this one');
  fireEvent.click(screen.getByTestId('sign-in'));
  await screen.findByText('E-mail or password is wrong. Check both.');
  expect(screen.getByLabelText('Password')).toHaveProperty('value', 'not this one');
});
