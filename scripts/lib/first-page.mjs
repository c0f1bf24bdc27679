import { readFile, writeFile } from 'node:fs/promises';
import { join } from 'node:path';
import { JSDOM, VirtualConsole } from 'jsdom';

/**
 * Writes sign-in.html: the sign-in page as the built program draws it, so that it is there before the program is. What is typed or pressed on it
 * until then is taken over by `components/people/early-form.ts`.
 */

const longestMs = 20_000;
const lookEveryMs = 20;
const never = () => new Promise(() => undefined);
const nothing = () => undefined;

/** What a browser has and jsdom lacks. Requests are never answered: who is signed in is not known while the page is built. */
function furnish(window) {
  const listen = { addListener: nothing, removeListener: nothing, addEventListener: nothing, removeEventListener: nothing };
  window.matchMedia = (media) => ({ matches: false, media, ...listen });
  window.fetch = never;
  for (const name of ['TextEncoder', 'TextDecoder', 'structuredClone']) window[name] ??= globalThis[name];
}

async function untilThere(document, selector) {
  for (let waitedMs = 0; waitedMs < longestMs; waitedMs += lookEveryMs) {
    if (document.querySelector(selector) !== null) return;
    await new Promise((resolve) => setTimeout(resolve, lookEveryMs));
  }
  throw new Error(`the built program drew no ${selector} at /sign-in within ${String(longestMs / 1000)} s`);
}

/** The program's own page at /sign-in, run without a browser. */
async function draw(html, program) {
  const virtualConsole = new VirtualConsole();
  virtualConsole.on('jsdomError', (error) => {
    throw error;
  });
  const ground = html.replace(/<(link|script)\b[^>]*>(<\/script>)?/g, '');
  const dom = new JSDOM(ground, { url: 'http://localhost/sign-in', runScripts: 'outside-only', pretendToBeVisual: true, virtualConsole });
  furnish(dom.window);
  dom.window.eval(program);
  await untilThere(dom.window.document, '[data-testid="sign-in"]');
  return dom.window;
}

/** The rules that react-native-web writes while it draws; it takes up the element where it finds it. */
function drawnRules(document) {
  const { sheet } = document.getElementById('react-native-stylesheet');
  return [...sheet.cssRules].map(({ cssText }) => cssText);
}

/** Writes sign-in.html into the folder of a web build. */
export async function writeFirstPage(folder) {
  const html = await readFile(join(folder, 'index.html'), 'utf8');
  const entryPath = /<script src="([^"]*)" defer>/.exec(html)?.[1];
  if (entryPath === undefined) throw new Error(`${folder}/index.html names no program`);
  const window = await draw(html, await readFile(join(folder, entryPath), 'utf8'));
  const root = window.document.getElementById('root');
  // The content security policy lets no page bring styles on its elements; the program needs none here, and a browser test compares what is seen.
  for (const element of root.querySelectorAll('[style]')) element.removeAttribute('style');
  const inline = async (name) => `<script>${(await readFile(join(folder, name), 'utf8')).trim()}</script>`;
  const [theme, early] = [await inline('theme.js'), await inline('early.js')];
  const style = `<style id="react-native-stylesheet">${drawnRules(window.document).join('\n')}</style>`;
  const page = html
    .replace('<script src="/theme.js"></script>', '')
    .replace(/<title>.*<\/title>/, () => `<title>${window.document.title}</title>`)
    // Before the style sheets, for a script that follows one waits for it.
    .replace(/<link rel="stylesheet"/, (first) => `${theme}\n    ${style}\n    ${first}`)
    .replace(/<div id="root">[\s\S]*<\/div>/, () => `<div id="root" data-early="${entryPath}">${root.innerHTML}</div>`)
    .replace(/<script src="[^"]*" defer><\/script>/, () => early);
  await writeFile(join(folder, 'sign-in.html'), page);
  window.close();
}
