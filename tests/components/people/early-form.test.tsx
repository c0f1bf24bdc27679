import { act, render, screen } from '@testing-library/react';
import { createElement, Suspense, use } from 'react';
import { CredentialsForm } from '@/components/people/credentials-form';
import { ThemeProvider } from '@/components/theme';

/** The form of the first page as plain HTML, with what somebody has typed while the program was on the way. */
function earlyPage(email: string): HTMLElement {
  document.body.innerHTML =
    '<div id="root" data-early="/program.js"><form><input data-testid="sign-in-email"><input data-testid="sign-in-password"></form></div>';
  const field = document.querySelector<HTMLInputElement>('[data-testid="sign-in-email"]');
  const root = document.getElementById('root');
  if (field === null || root === null) throw new Error('the page is as it was written above');
  field.value = email;
  return root;
}

const fieldSays = (name: string) => screen.getByTestId<HTMLInputElement>(`sign-in-${name}`).value;
const form = createElement(ThemeProvider, null, createElement(CredentialsForm, { onSignedIn: () => undefined }));

afterEach(() => {
  document.body.innerHTML = '';
});

test('what was typed before the program came stands in its own form', () => {
  render(form, { container: earlyPage('ada@thornfield.example') });
  expect(fieldSays('email')).toBe('ada@thornfield.example');
});

test('it is not lost where React throws a form away that it had begun, as it does for what has to wait', async () => {
  let arrive: () => void = () => undefined;
  const late = new Promise<void>((resolve) => {
    arrive = resolve;
  });
  function Late() {
    use(late);
    return null;
  }
  const container = earlyPage('ada@thornfield.example');
  await act(async () => render(createElement(Suspense, { fallback: null }, form, createElement(Late)), { container }));
  await act(async () => arrive());
  expect(fieldSays('email')).toBe('ada@thornfield.example');
});

test('a form that the program draws later is empty', () => {
  render(form);
  expect(fieldSays('email')).toBe('');
});
