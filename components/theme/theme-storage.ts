import { themeNames, type ThemeName } from './tokens';

/** The choice belongs to the device, not to the account: the phone at the rig is red while the desk is light. */
const key = 'evenfall.theme';

const isThemeName = (value: string | null): value is ThemeName => value !== null && (themeNames as readonly string[]).includes(value);

/** The theme chosen on this device, or null while none was chosen (or storage is refused). */
export function readChosenTheme(): ThemeName | null {
  try {
    const value = window.localStorage.getItem(key);
    return isThemeName(value) ? value : null;
  } catch {
    return null;
  }
}

/** Remembers the choice; a browser that refuses storage keeps it for this page only. */
export function storeChosenTheme(name: ThemeName): void {
  try {
    window.localStorage.setItem(key, name);
  } catch {
    return;
  }
}

/** Until somebody chooses: the room is dark, so a light page is never shown unasked. */
export const usualTheme: ThemeName = 'dark';

/** Puts the theme on the page: the class that carries the variables, and the colour of the browser's own bars. */
export function showTheme(name: ThemeName, ground: string): void {
  const page = document.documentElement;
  for (const other of themeNames) page.classList.toggle(`theme-${other}`, other === name);
  document.querySelector('meta[name="theme-color"]')?.setAttribute('content', ground);
}
