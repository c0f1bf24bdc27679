const expo = require('eslint-config-expo/flat');
const boundaries = require('eslint-plugin-boundaries');

/** Folder → what it may import (besides packages). A folder without a row here fails. */
const layers = {
  app: ['components', 'shared'],
  components: ['shared'],
  shared: [],
  'firmware-protocol': [],
  db: ['shared'],
  'server/interfaces': ['shared'],
  'server/store': ['db', 'shared', 'server/interfaces'],
  'server/engine': ['shared', 'server/interfaces'],
  'server/links': ['shared', 'firmware-protocol', 'server/interfaces'],
  'server/scheduler': ['shared', 'server/interfaces'],
  'server/ingest': ['shared', 'server/interfaces', 'server/store'],
  'server/evaluation': ['shared', 'server/interfaces', 'server/store'],
  'server/notify': ['shared', 'server/interfaces', 'server/store'],
  'server/auth': ['shared', 'server/interfaces', 'server/store'],
  'server/http': [
    'shared',
    'server/interfaces',
    'server/store',
    'server/auth',
    'server/engine',
    'server/evaluation',
    'server/ingest',
    'server/notify',
    'server/scheduler',
  ],
  'server/boot': [
    'shared',
    'db',
    'firmware-protocol',
    ...['interfaces', 'store', 'engine', 'links', 'scheduler', 'ingest', 'evaluation', 'notify', 'auth', 'http'].map(
      (name) => `server/${name}`,
    ),
  ],
  tests: null,
};

const everything = Object.keys(layers);
const element = (name) => ({ element: { type: name } });
const policyOf = (name) => ({
  from: element(name),
  allow: [name, ...(layers[name] ?? everything)].map((other) => ({ to: element(other) })),
});
const code = '**/*.{ts,tsx}';
const ban = (object, property, message) => ({ object, property, message });
const clockMessage = 'Time and randomness come in through server/interfaces; only server/boot may use the real ones.';

const wholeZod = {
  selector: "ImportDeclaration[source.value='zod'] > :matches(ImportSpecifier, ImportDefaultSpecifier)",
  message: "import * as z from 'zod': the named export brings every locale.",
};

/** What is no screen has no hooks, and TypeScript itself knows what a module exports: these rules would take most of the time. */
const ofScreens = Object.keys(Object.assign({}, ...expo.map(({ rules = {} }) => rules))).filter((name) => /^react(-hooks)?\//.test(name));
const off = (rules) => Object.fromEntries(rules.map((name) => [name, 'off']));

const pureRules = {
  'no-restricted-properties': [
    'error',
    ban('Date', 'now', clockMessage),
    ban('Math', 'random', clockMessage),
    ban('performance', 'now', clockMessage),
  ],
  'no-restricted-globals': ['error', ...['setTimeout', 'setInterval', 'setImmediate'].map((name) => ({ name, message: clockMessage }))],
  'no-restricted-syntax': ['error', wholeZod, { selector: "NewExpression[callee.name='Date'][arguments.length=0]", message: clockMessage }],
};

module.exports = [
  {
    ignores: ['node_modules/**', 'dist/**', '.state/**', '.expo/**', 'test-output/**', 'expo-env.d.ts', 'nativewind-env.d.ts', 'public/**'],
  },
  ...expo,
  {
    files: [code],
    plugins: { boundaries },
    settings: {
      'boundaries/root-path': __dirname,
      'boundaries/include': [`{app,components,shared,firmware-protocol,db,server,tests}/${code}`],
      'boundaries/elements': everything.map((name) => ({ type: name, partialMatch: false, pattern: name })),
      'import/resolver': { typescript: { project: __dirname } },
    },
    rules: {
      'boundaries/no-unknown-files': 'error',
      'boundaries/no-unknown-dependencies': 'error',
      'boundaries/dependencies': ['error', { default: 'disallow', policies: everything.map(policyOf) }],
      '@typescript-eslint/no-explicit-any': 'error',
      '@typescript-eslint/no-unused-vars': ['error', { argsIgnorePattern: '^_' }],
      '@typescript-eslint/array-type': 'off',
      '@typescript-eslint/no-require-imports': 'off',
      'import/no-default-export': 'error',
      'import/namespace': 'off',
      'no-console': 'error',
      'max-params': ['error', 3],
      'max-lines-per-function': ['error', { max: 60, skipBlankLines: true, skipComments: true }],
      'no-restricted-syntax': ['error', wholeZod],
    },
  },
  { files: ['shared/**/*.ts', 'firmware-protocol/**/*.ts', 'db/**/*.ts', 'server/**/*.ts'], ignores: ['server/boot/**'], rules: pureRules },
  { files: ['shared/**/*.ts'], rules: { 'no-restricted-imports': ['error', { patterns: ['node:*', 'fs', 'crypto', 'path'] }] } },
  { files: ['app/**/*.tsx', '*.config.{js,ts}', 'tests/**', 'drizzle.config.ts'], rules: { 'import/no-default-export': 'off' } },
  {
    files: ['tests/**'],
    // Tests may import everything: each of their imports need not be looked up in the table.
    rules: { 'boundaries/dependencies': 'off', 'max-lines-per-function': 'off', 'max-params': 'off', 'import/first': 'off' },
  },
  {
    files: ['components/**/*.tsx', 'app/**/*.tsx'],
    rules: { 'max-lines-per-function': ['error', { max: 120, skipBlankLines: true, skipComments: true }] },
  },
  { files: ['{server,shared,db,firmware-protocol,scripts,tests}/**'], ignores: ['tests/components/**'], rules: off(ofScreens) },
  { files: ['scripts/**', '*.config.js'], languageOptions: { globals: { process: 'readonly', __dirname: 'readonly' } } },
];
