import { appendFileSync, mkdtempSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { FileJournals } from '@/server/boot/file-journal';
import type { RunWrite } from '@/server/interfaces/run-store';

const folder = mkdtempSync(join(tmpdir(), 'evenfall-journal-'));
afterAll(() => rmSync(folder, { recursive: true }));

const run = { rigId: 'north-bench', runId: 'run-1' };
const file = join(folder, 'north-bench.run-1.jsonl');
const write = (seq: number): RunWrite => ({
  labId: 'lab',
  runId: 'run-1',
  expectedSeq: seq - 1,
  snapshot: { state: 'held', place: 'Røros' },
  chartVersion: 3,
  steps: [],
  events: [{ seq, at: '2026-03-01T22:00:00.000Z', kind: 'held', data: {}, prev: '0', hash: String(seq) }],
  summary: { state: 'held', outcome: 'held', startedAtUtcMs: 1, endedAtUtcMs: null, predictedEndUtcMs: null },
});

afterEach(() => {
  for (const name of readdirSync(folder)) rmSync(join(folder, name));
});

test('what one process wrote, another reads in the same order; what is in the database is removed', async () => {
  const journal = new FileJournals(folder).of(run);
  await Promise.all([journal.append(write(1)), journal.append(write(2)), journal.append(write(3))]);
  const next = new FileJournals(folder).of(run);
  expect(await next.read()).toEqual([write(1), write(2), write(3)]);
  await next.clear();
  expect(await next.read()).toEqual([]);
  expect(readdirSync(folder)).toEqual([]);
  await next.append(write(4));
  expect(await next.read()).toEqual([write(4)]);
});

test('a run without a journal has nothing to be read', async () => {
  const journals = new FileJournals(join(folder, 'not', 'yet', 'made'));
  expect(await journals.of(run).read()).toEqual([]);
});

test('a last line that a crash cut off is left out, wherever it was cut', async () => {
  const journal = new FileJournals(folder).of(run);
  await journal.append(write(1));
  const whole = readFileSync(file);
  await journal.append(write(2));
  const both = readFileSync(file);
  for (let length = whole.length; length < both.length; length += 37) {
    writeFileSync(file, both.subarray(0, length));
    expect(await new FileJournals(folder).of(run).read()).toEqual([write(1)]);
  }
});

test('at its bound it takes no more, keeps what it has, and says so', async () => {
  const journal = new FileJournals(folder, 1500).of(run);
  await journal.append(write(1));
  await expect(
    (async () => {
      for (let seq = 2; seq < 9; seq += 1) await journal.append(write(seq));
    })(),
  ).rejects.toThrow(/is full: it holds \d+ bytes, and 1500 are the most/);
  const kept = await journal.read();
  expect(kept.length).toBeGreaterThan(1);
  expect(kept[0]).toEqual(write(1));
  await journal.clear();
  await journal.append(write(9));
  expect(await journal.read()).toEqual([write(9)]);
});

test('a line of another version, or one that was spoilt, is not taken for anything else', async () => {
  const journal = new FileJournals(folder).of(run);
  await journal.append(write(1));
  appendFileSync(file, '{"journal":2,"something":"new"}\n');
  await expect(new FileJournals(folder).of(run).read()).rejects.toThrow(
    /Line 2 of .*north-bench\.run-1\.jsonl is no journal line of version 1/,
  );
  writeFileSync(file, 'spoilt\n');
  await expect(new FileJournals(folder).of(run).read()).rejects.toThrow(/Line 1 of/);
});

test('what no longer fits the database is kept under another name', async () => {
  const journal = new FileJournals(folder).of(run);
  await journal.append(write(1));
  const aside = await journal.setAside();
  expect(readFileSync(aside, 'utf8')).toContain('"hash":"1"');
  expect(await journal.read()).toEqual([]);
});
