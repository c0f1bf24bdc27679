import { existsSync, mkdirSync, mkdtempSync, readdirSync, readFileSync, rmSync, statSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { readArchive } from '@/shared/archive/read-archive';
import { UnusableArchive } from '@/shared/archive/unusable-archive';
import { evaluateArchive } from '@/shared/evaluation/evaluate-archive';
import type { Step } from '@/shared/protocol/document';
import { templates } from '@/shared/protocol/templates';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';
import { main } from '@/server/boot/rehearse';
import { readArchiveFiles } from '@/server/evaluation/archive-files';
import { sha256Hex } from '@/server/evaluation/sha256';
import { shortProtocol } from './rehearsing';

/** The command as it is called from a shell: arguments in, one JSON object or a sentence out, an archive in a folder. */

const folder = mkdtempSync(join(tmpdir(), 'evenfall-rehearse-'));
afterAll(() => rmSync(folder, { recursive: true }));

const at = (name: string) => join(folder, name);
const file = (name: string, content: unknown) => {
  writeFileSync(at(name), typeof content === 'string' ? content : JSON.stringify(content));
  return at(name);
};

async function command(...args: string[]): Promise<{ code: number; out: string; err: string }> {
  let out = '';
  let err = '';
  const code = await main(args, { out: (text) => void (out += text), err: (text) => void (err += text) });
  return { code, out, err };
}

const answer = (out: string) => JSON.parse(out) as Record<string, unknown>;

function allFiles(root: string, under = ''): [string, string][] {
  return readdirSync(join(root, under))
    .sort()
    .flatMap((name): [string, string][] => {
      const path = under === '' ? name : `${under}/${name}`;
      return statSync(join(root, path)).isDirectory() ? allFiles(root, path) : [[path, sha256Hex(readFileSync(join(root, path)))]];
    });
}

const short = () => file('short.json', { ...shortProtocol, steps: shortProtocol.steps.slice(0, 3) });

describe('the rehearsal of a short night', () => {
  const archive = () => readArchive(readArchiveFiles(at('night')), sha256Hex);

  beforeAll(async () => {
    expect((await command('--template', 'near-far-short', '--out', at('night'))).code).toBe(0);
  }, 60_000);

  test('leaves an archive that verifies, with the recipe in run.json and times from the simulated clock', () => {
    const run = JSON.parse(readFileSync(at('night/run.json'), 'utf8')) as Record<string, unknown>;
    expect(run).toMatchObject({
      outcome: 'finished',
      startedAt: '2000-01-01T00:00:00.000Z',
      simulated: { trueG: 6.6743e-11, seed: 1, rateHz: 10 },
    });
    const datapackage = JSON.parse(readFileSync(at('night/datapackage.json'), 'utf8')) as { created: string };
    expect(datapackage.created).toMatch(/^2000-01-01T03:12:4/);
    expect(archive().chain).toMatchObject({ valid: true });
    expect(readFileSync(at('night/events.jsonl'), 'utf8').trim().split('\n').at(-1)).toContain('"kind":"archived"');
  });

  test('gives G back: |G − true G| ≤ 2 u, and u/G below 1 %', () => {
    const { result } = evaluateArchive(archive());
    expect(result.G?.u).toBeGreaterThan(0);
    expect(Math.abs((result.G?.value ?? 0) - 6.6743e-11)).toBeLessThanOrEqual(2 * (result.G?.u ?? 0));
    expect(result.relativeU).toBeLessThan(0.01);
    expect(result.dwells.filter(({ used }) => used)).toHaveLength(12);
  });

  test('a tampered event is named by its number', () => {
    const lines = readFileSync(at('night/events.jsonl'), 'utf8').split('\n');
    const tampered = new Map(readArchiveFiles(at('night')));
    const event = JSON.parse(lines[6] ?? '') as { seq: number; at: string };
    lines[6] = JSON.stringify({ ...event, at: event.at.replace('2000', '2001') });
    tampered.set('events.jsonl', new TextEncoder().encode(lines.join('\n')));
    const datapackage = JSON.parse(readFileSync(at('night/datapackage.json'), 'utf8')) as {
      resources: { path: string; hash?: string; bytes?: number }[];
    };
    for (const resource of datapackage.resources) {
      if (resource.path !== 'events.jsonl') continue;
      delete resource.hash;
      delete resource.bytes;
    }
    tampered.set('datapackage.json', new TextEncoder().encode(JSON.stringify(datapackage)));
    const read = () => readArchive(tampered, sha256Hex);
    expect(read).toThrow(UnusableArchive);
    expect(read).toThrow(/\b7\b/);
  });

  test('dwells last to the beat: from swing to swing two periods, to the controller’s clock', () => {
    const swings = archive()
      .steps.filter(({ kind }) => kind === 'swing')
      .slice(1);
    for (let i = 1; i < swings.length; i += 1) {
      const beatMs = (swings[i]?.startUtcMs ?? 0) - (swings[i - 1]?.startUtcMs ?? 0);
      // Two periods of 420 s; a step of the controller's clock is a microsecond, its uncertainty some hundredths of a millisecond.
      expect(Math.abs(beatMs - 840_000)).toBeLessThan(0.1);
    }
  });

  test('the printed object has the names of the format', async () => {
    const { out } = await command(short(), '--out', at('named'));
    expect(Object.keys(answer(out))).toEqual(['outcome', 'simulated_s', 'elapsed_s', 'steps', 'holds', 'archive']);
    expect(answer(out)).toMatchObject({ outcome: 'finished', steps: 3, holds: 0, archive: at('named') });
    expect(out.trim().split('\n')).toHaveLength(1);
  });
});

test('the same seed gives the same archive byte for byte, another seed another one', async () => {
  for (const name of ['one', 'two']) await command(short(), '--out', at(name), '--seed', '7', '--fault', 'garbage@20');
  await command(short(), '--out', at('three'), '--seed', '8', '--fault', 'garbage@20');
  expect(allFiles(at('one'))).toEqual(allFiles(at('two')));
  expect(allFiles(at('one'))).not.toEqual(allFiles(at('three')));
});

test('seed, rate, true G and start are taken, and told in run.json', async () => {
  await command(short(), '--out', at('own'), '--seed', '42', '--rate', '2', '--true-g', '7e-11', '--start', '2031-05-06T21:00:00Z');
  expect(JSON.parse(readFileSync(at('own/run.json'), 'utf8'))).toMatchObject({
    startedAt: '2031-05-06T21:00:00.000Z',
    simulated: { trueG: 7e-11, seed: 42, rateHz: 2 },
  });
  const [, first, second] = readFileSync(at('own/channels/deflection.csv'), 'utf8').split('\n');
  expect([first?.split(',')[0], second?.split(',')[0]]).toEqual(['2031-05-06T21:00:00.250000Z', '2031-05-06T21:00:00.750000Z']);
});

test.each([
  { outcome: 'held', onInterruption: 'hold', fault: 'controller-reset@20', holds: 1 },
  { outcome: 'stopped', onInterruption: 'stop', fault: 'link-drop@20', holds: 0 },
  { outcome: 'finished', onInterruption: 'resume', fault: 'server-kill@20', holds: 0 },
])('a run that ends $outcome exits with 0 as well', async ({ outcome, onInterruption, fault, holds }) => {
  const protocol = file(`${onInterruption}.json`, { ...shortProtocol, onInterruption, steps: shortProtocol.steps.slice(0, 3) });
  const { code, out } = await command(protocol, '--out', at(`end-${outcome}`), '--fault', fault);
  expect(code).toBe(0);
  expect(answer(out)).toMatchObject({ outcome, holds });
  expect(readArchive(readArchiveFiles(at(`end-${outcome}`)), sha256Hex).chain).toMatchObject({ valid: true });
});

/** Each repeat once is enough to see that the steps go through. */
const onePassEach = (steps: readonly Step[]): Step[] =>
  steps.map((step) => (step.kind === 'repeat' ? { ...step, times: 1, steps: onePassEach(step.steps) } : step));

test.each(templates)('the template $id goes through to its end', async ({ id, make, rigFor }) => {
  const protocol = make(demoRigWide);
  const { code, out } = await command(
    file(`${id}.json`, { ...protocol, steps: onePassEach(protocol.steps) }),
    '--rig',
    file(`${id}-rig.json`, rigFor(demoRigWide)),
    '--out',
    at(id),
    '--rate',
    '0.1',
  );
  expect(code).toBe(0);
  expect(answer(out)).toMatchObject({ outcome: 'finished', holds: 0 });
});

test('a geometry is drawn from what the rig document admits: the archive holds the document, and the pendulum feels another rig', async () => {
  const angles = (name: string) => readFileSync(at(`${name}/channels/deflection.csv`), 'utf8');
  for (const [name, more] of [
    ['plain', []],
    ['drawn', ['--draw-geometry']],
    ['again', ['--draw-geometry']],
  ] as const)
    expect((await command(short(), '--rate', '1', ...more, '--out', at(name))).code).toBe(0);
  expect(JSON.parse(readFileSync(at('drawn/run.json'), 'utf8'))).toMatchObject({ simulated: { seed: 1, drawGeometry: true } });
  expect(readFileSync(at('drawn/rig.json'), 'utf8')).toBe(readFileSync(at('plain/rig.json'), 'utf8'));
  expect(angles('drawn')).toBe(angles('again'));
  expect(angles('drawn')).not.toBe(angles('plain'));
});

test('a rig whose masses may not pass the balls goes through as well', async () => {
  const { out } = await command('--template', 'proof', '--rig', file('narrow.json', demoRigNarrow), '--out', at('narrow'), '--rate', '0.1');
  expect(answer(out)).toMatchObject({ outcome: 'finished', holds: 0 });
});

test('without gravity all that moves the pendulum is something else', async () => {
  const { code } = await command(short(), '--out', at('weightless'), '--true-g', '0');
  expect(code).toBe(0);
  expect(JSON.parse(readFileSync(at('weightless/run.json'), 'utf8'))).toMatchObject({ simulated: { trueG: 0 } });
});

test('no row of the log begins before the one above it has ended, to the microsecond', () => {
  const rows = readFileSync(at('night/steps.csv'), 'utf8')
    .trim()
    .split('\n')
    .slice(1)
    .map((row) => row.split(','));
  expect(rows.length).toBeGreaterThan(20);
  for (const [index, row] of rows.entries())
    if (index > 0) expect([row[0], String(row[7]) >= String(rows[index - 1]?.[8])]).toEqual([row[0], true]);
});

describe('unusable input ends with 2, a sentence, and no folder', () => {
  const month = { formatVersion: 1, name: 'x', steps: [{ kind: 'home' }, { kind: 'dwell', for_s: 30 * 86_400 }] };
  mkdirSync(at('full'));
  writeFileSync(at('full/kept.txt'), 'kept');
  const unusable: [string, string[], string][] = [
    ['no protocol', [], 'No protocol was given'],
    ['a file and a template', [short(), '--template', 'near-far'], 'one of the two is needed'],
    ['an unknown template', ['--template', 'swings'], 'There is no template "swings"'],
    ['a file that is not there', [at('nowhere.json')], 'cannot be read'],
    ['a file that is no JSON', [file('broken.json', '{"formatVersion": 1,')], 'Line 1'],
    [
      'an unknown station',
      [file('atlantis.json', { formatVersion: 1, name: 'x', steps: [{ kind: 'home' }, { kind: 'swing', to: 'atlantis' }] })],
      'atlantis',
    ],
    ['a rig without motion', [short(), '--rig', file('motionless.json', { ...demoRigWide, motion: undefined })], 'motion'],
    ['a rig without a period', [short(), '--rig', file('untimed.json', { ...demoRigWide, measured: undefined })], 'measured.period_s'],
    ['a seed that is none', [short(), '--seed', '1.5'], '--seed 1.5'],
    ['a rate of nothing', [short(), '--rate', '0'], '--rate 0'],
    ['more samples than fit into memory', [file('month.json', month), '--rate', '10'], 'Accepted is a --rate up to 1.9'],
    ['a G that is none', [short(), '--true-g', 'big'], '--true-g big'],
    ['a start without a zone', [short(), '--start', '2000-01-01T00:00:00'], '--start'],
    ['an unknown fault', [short(), '--fault', 'earthquake@10'], 'KIND@SECONDS'],
    ['a fault without its second', [short(), '--fault', 'garbage'], 'KIND@SECONDS'],
    ['an unknown option', [short(), '--speed', '3'], 'speed'],
  ];

  test.each(unusable)('%s', async (_, args, words) => {
    const { code, out, err } = await command(...args, '--out', at('never'));
    expect({ code, out }).toEqual({ code: 2, out: '' });
    expect(err).toContain(words);
    expect(existsSync(at('never'))).toBe(false);
  });

  test('no folder to write to', async () => {
    expect(await command(short())).toMatchObject({ code: 2, err: expect.stringContaining('--out DIR is needed') });
  });

  test('a folder that cannot be made', async () => {
    expect(await command(short(), '--out', join(short(), 'below'))).toMatchObject({
      code: 2,
      err: expect.stringContaining('cannot be made'),
    });
  });

  test('a folder that is not empty keeps what it holds', async () => {
    expect(await command(short(), '--out', at('full'))).toMatchObject({ code: 2, err: expect.stringContaining('not empty') });
    expect(readdirSync(at('full'))).toEqual(['kept.txt']);
  });

  test('a folder that is empty is taken', async () => {
    mkdirSync(at('empty'));
    expect((await command(short(), '--out', at('empty'))).code).toBe(0);
  });
});
