import { codeFiles, productFiles, text, trackedFiles } from './tree';
import ratchet from './ratchet.json';

/** Rules of the house that no linter knows. Where the tree is not yet there, `ratchet.json` holds what is left: it may only shrink. */

const ownPath = 'tests/house/house-rules.test.ts';
const lines = (path: string) => text(path).split('\n').length - 1;

function keepsRatchet(found: string[], allowed: string[]) {
  expect({ new: found.filter((path) => !allowed.includes(path)), cured: allowed.filter((path) => !found.includes(path)) }).toEqual({
    new: [],
    cured: [],
  });
}

test('the top level holds what the architecture names, and nothing else', () => {
  const allowed = new Set(
    (
      'app server firmware-protocol db shared assets tests components scripts docs public .ci drizzle.config.ts tailwind.config.js package.json package-lock.json ' +
      'tsconfig.json README.md DEVELOPERS.md LICENSE CHANGELOG.md app.json babel.config.js metro.config.js jest.config.js eslint.config.js knip.json global.css ' +
      '.gitignore .npmrc .prettierrc.json .prettierignore'
    ).split(' '),
  );
  const top = new Set(trackedFiles().map((path) => path.split('/')[0] as string));
  expect([...top].filter((name) => !allowed.has(name))).toEqual([]);
});

test('no file is longer than 300 lines, the engine 400', () => {
  const long = codeFiles().filter((path) => lines(path) > (path.startsWith('server/engine/') ? 400 : 300));
  keepsRatchet(long, ratchet.longFiles);
});

test('routes of the application are at most 40 lines and hold no logic of their own', () => {
  expect(codeFiles().filter((path) => path.startsWith('app/') && lines(path) > 40)).toEqual([]);
});

test('file names are kebab-case', () => {
  const routeName = /^app\//;
  expect(
    codeFiles().filter(
      (path) => !routeName.test(path) && !/^[a-z0-9]+(-[a-z0-9]+)*(\.[a-z0-9-]+)*\.tsx?$/.test(path.split('/').at(-1) as string),
    ),
  ).toEqual([]);
});

test('the firmware keeps the same measure: at most 300 lines, kebab-case, no C++ standard library', () => {
  const firmware = trackedFiles().filter((path) => /\.(cpp|hpp)$/.test(path));
  expect(firmware.filter((path) => lines(path) > 300 || !/\/[a-z0-9]+(-[a-z0-9]+)*\.[ch]pp$/.test(path))).toEqual([]);
  expect(firmware.filter((path) => /#include <(?!avr\/|util\/)[^>.]+>/.test(text(path)))).toEqual([]);
});

test('nothing imports the tests', () => {
  expect(productFiles().filter((path) => /from '(@\/|(\.\.\/)+)tests\//.test(text(path)))).toEqual([]);
});

test('no rule is switched off in place and nothing is left to do', () => {
  const banned = new RegExp(['eslint-disable', '@ts-ignore', '@ts-nocheck', '\\bTO' + 'DO\\b', '\\bFIX' + 'ME\\b'].join('|'));
  expect(codeFiles().filter((path) => path !== ownPath && banned.test(text(path)))).toEqual([]);
});

test('skipped tests give their reason beside them', () => {
  const skipped = /\b(it|test|describe)\.(skip|only|todo)\b|\bx(it|describe)\(/;
  const without = codeFiles().filter((path) => {
    const all = text(path).split('\n');
    return all.some((line, index) => skipped.test(line) && !/\/\/ reason: /.test(`${all[index - 1] ?? ''}${line}`));
  });
  expect(without.filter((path) => path !== ownPath)).toEqual([]);
});

test('the lock file carries no addresses and package.json no floating versions', () => {
  expect(text('package-lock.json')).not.toMatch(/"resolved":/);
  const manifest = JSON.parse(text('package.json')) as Record<'dependencies' | 'devDependencies', Record<string, string>>;
  const floating = Object.entries({ ...manifest.dependencies, ...manifest.devDependencies }).filter(
    ([, version]) => !/^(npm:[\w-]+@)?\d+\.\d+\.\d+$/.test(version),
  );
  expect(floating).toEqual([]);
});

test('words have one name: those that the vocabulary rules out are not shown to anybody', () => {
  const banned = /['"`>][^'"`<>\n]*\b([Jj]og(ging)?|[Pp]re-?flight|[Ii]nspector|[Ww]hat-if|[Dd]ead[- ]letter)\b[^'"`<>\n]*['"`<]/;
  expect(productFiles().filter((path) => banned.test(text(path)))).toEqual([]);
});
