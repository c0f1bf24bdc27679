/** The sign-in form that stood on the page as plain HTML before the program came (scripts/lib/first-page.mjs). */
export interface EarlyForm {
  focused: 'email' | 'password' | null;
  /** What was typed until now, and whether "Sign in" was pressed already; null once it was taken over. For when the program has drawn its own form in its place. */
  take: () => { email: string; password: string; pressed: boolean } | null;
}

/** React may throw away what it began to draw, empty the page and begin anew; the fields that stood there still know what was typed. */
const found = new WeakMap<Element, EarlyForm>();

/** Finds it, and changes nothing; null on every page that the program drew itself. */
export function findEarlyForm(): EarlyForm | null {
  const root = document.querySelector('#root[data-early]');
  if (root === null) return null;
  const early = found.get(root) ?? readForm(root);
  if (early !== null) found.set(root, early);
  return early;
}

function readForm(root: Element): EarlyForm | null {
  const input = (name: string) => root.querySelector<HTMLInputElement>(`[data-testid="sign-in-${name}"]`);
  const [email, password] = [input('email'), input('password')];
  if (email === null || password === null) return null;
  const { activeElement } = document;
  return {
    focused: activeElement === email ? 'email' : activeElement === password ? 'password' : null,
    take: () => {
      if (!root.hasAttribute('data-early')) return null;
      root.removeAttribute('data-early');
      return { email: email.value, password: password.value, pressed: root.hasAttribute('data-pressed') };
    },
  };
}
