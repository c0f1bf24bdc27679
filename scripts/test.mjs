#!/usr/bin/env node
/** `npm test`: sets up all that the tests need, then checks, unit, contract, database and browser tests. Arguments go to Jest. */
import { mkdirSync, readFileSync, rmSync } from 'node:fs';
import { join } from 'node:path';
import { startCluster } from './lib/cluster.mjs';
import { ensureDebianPackages } from './lib/debian.mjs';
import { ensureNodeModules } from './lib/node-modules.mjs';
import { root } from './lib/paths.mjs';
import { pass } from './lib/run.mjs';
import { say } from './lib/say.mjs';
import { ensureWebBuild } from './lib/web-build.mjs';

const args = process.argv.slice(2);
const whole = args.length === 0;
/** A real browser, pseudo-terminal, process or socket: the tests that wait for the machine itself. */
const inRealTime = /tests\/(e2e|contract|server\/(boot|http))\//;
const start = Date.now();
const output = join(root, 'test-output');
mkdirSync(output, { recursive: true });
/** Debian's packages and the cluster need nothing of npm's. */
async function machine() {
  await ensureDebianPackages([
    'postgresql',
    'chromium-headless-shell',
    'socat',
    'ser2net',
    'mosquitto',
    'openssl',
    'g++',
    'gcc-avr',
    'avr-libc',
  ]);
  return startCluster('test');
}
const [cluster] = await Promise.all([machine(), ensureNodeModules()]);
/** Servers among the tests stand back too, for as long as it takes: that is no reason for them to give up. */
const env = { ...process.env, EVENFALL_DATABASE_ADMIN_URL: cluster.url('postgres'), EVENFALL_WATCHDOG_S: '60', TZ: 'UTC' };
/** The row with the browser is the longest and the only one in real time: the others stand back for it. */
const standingBack = (command, args, options) => pass('nice', ['-n', '19', command, ...args], options);
const jest = (more, report, run = pass) =>
  run(
    process.execPath,
    [
      join(root, 'node_modules', 'jest', 'bin', 'jest.js'),
      '--testTimeout=30000',
      '--forceExit',
      '--json',
      `--outputFile=${report}`,
      ...more,
    ],
    { cwd: root, env },
  );
const [inBrowser, ...halves] = ['jest-browser.json', 'jest.json', 'jest-other-half.json'].map((name) => join(output, name));
for (const report of [inBrowser, ...halves]) rmSync(report, { force: true });

/** The browser's tests, two halves of the others and the check go on beside each other, each in one row of its own: no processor waits. */
async function all() {
  const [checked, ...tested] = await Promise.all([
    standingBack(process.execPath, [join(root, 'scripts', 'check.mjs'), '--beside-tests'], { cwd: root }),
    ensureWebBuild().then(() => jest(['--selectProjects', 'e2e-row', '-i'], inBrowser)),
    ...halves.map((report, k) =>
      jest(['--selectProjects', 'node', 'web', '-i', `--shard=${k + 1}/${halves.length}`], report, standingBack),
    ),
  ]);
  return { checked, tested: Math.max(...tested) };
}

async function some() {
  await ensureWebBuild();
  return { checked: 0, tested: await jest(args, halves[0]) };
}

const ran = await (whole ? all() : some());
let { tested } = ran;
const reports = (whole ? [inBrowser, ...halves] : halves.slice(0, 1)).map((report) => JSON.parse(readFileSync(report, 'utf8')));
const sum = (key) => reports.reduce((total, report) => total + report[key], 0);
/** The files behind the failures; the row with the browser is one file that names others by its outermost descriptions. */
const failed = reports
  .flatMap(({ testResults }) => testResults.filter(({ status }) => status === 'failed'))
  .flatMap(({ name, assertionResults }) => {
    if (!name.endsWith(join('e2e', 'row.ts'))) return [name];
    const told = assertionResults.filter(({ status }) => status === 'failed').map(({ ancestorTitles: [file] }) => file);
    return told.length === 0 ? [name] : [...new Set(told)].map((file) => join(root, 'tests', 'e2e', `${file}.test.ts`));
  });
let stillFailed = sum('numFailedTests');
if (whole && failed.length > 0 && failed.every((name) => inRealTime.test(name))) {
  say(`Second try, alone, for what runs in real time and may starve on a busy machine:\n  ${failed.join('\n  ')}`);
  const again = join(output, 'jest-again.json');
  tested = await jest(['-i', '--runTestsByPath', ...failed], again);
  stillFailed = JSON.parse(readFileSync(again, 'utf8')).numFailedTests;
}
if (!cluster.wasRunning) await cluster.stop();
say(`${((Date.now() - start) / 1000).toFixed(0)} s in all`);
process.stdout.write(
  `${sum('numTotalTests') - stillFailed - sum('numPendingTests')} passed, ${stillFailed} failed, ${sum('numPendingTests')} skipped\n`,
);
process.exit(Math.max(ran.checked, tested));
