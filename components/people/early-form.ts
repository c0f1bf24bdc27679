/** The sign-in form that stood on the page as plain HTML before the program came (scripts/lib/first-page.mjs). */
export interface EarlyForm {
  /** What was typed until now. The elements are read again after the program has drawn its own in their place. */
  values: () => { email: string; password: string };
  focused: 'email' | 'password' | null;
  /** Whether "Sign in" was pressed already. */
  pressed: () => boolean;
}

const input = (root: Element, name: string) => root.querySelector<HTMLInputElement>(`[data-testid="sign-in-${name}"]`);

/** Takes it over, once: null on every page that the program drew itself. */
export function takeEarlyForm(): EarlyForm | null {
  const root = document.querySelector('#root[data-early]');
  if (root === null) return null;
  const [email, password] = [input(root, 'email'), input(root, 'password')];
  if (email === null || password === null) return null;
  root.removeAttribute('data-early');
  const { activeElement } = document;
  return {
    values: () => ({ email: email.value, password: password.value }),
    focused: activeElement === email ? 'email' : activeElement === password ? 'password' : null,
    pressed: () => root.hasAttribute('data-pressed'),
  };
}
