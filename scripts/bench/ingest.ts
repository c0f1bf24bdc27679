import { createReadStream, createWriteStream, mkdtempSync, rmSync, statSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { Readable } from 'node:stream';
import { pipeline } from 'node:stream/promises';
import { from as copyFrom } from 'pg-copy-streams';
import { demoIds } from '@/db/demo/seed';
import { FolderObjects } from '@/server/boot/folder-objects';
import { readCsv } from '@/server/ingest/csv-read';
import { inTurns } from '@/server/ingest/receive-file';
import { storeImport } from '@/server/store/import-commit';
import { beginImport } from '@/server/store/import-files';
import * as store from '@/server/store/imports';
import { insertRun } from '@/server/store/run-store';
import { createSampleStore } from '@/server/store/sample-store';
import type { ImportMapping } from '@/shared/contracts/data';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { withDatabase, type BenchDatabase } from './lib/fresh-database';
import { seedLab } from './lib/people';
import { sizesOf } from './lib/sizes';
import { growth, quantile, report } from './report';

/**
 * Stores CSV files of deflection as the import does: read from the folder of files, parsed, staged, checked in SQL, stored under the table's
 * key. The peer is PostgreSQL's own COPY of the same rows into the same table.
 */

const sizes = sizesOf([100_000, 1_000_000, 10_000_000]);
const startUtcMs = Date.UTC(2026, 0, 1);
const intervalMs = 100;
const rowsAPiece = 20_000;
const turns = 20;
const batchesATurn = 10;
const greatestSpanRad = 0.06;
const runId = '5eed0000-0000-4000-8000-000000000900';
const { lab: labId, rig: rigId } = demoIds;

const mapping: ImportMapping = {
  delimiter: ',',
  decimal: '.',
  headerRow: true,
  timeColumn: 0,
  timeFormat: 'iso',
  valueColumn: 1,
  unit: 'rad',
};

/** A slow oscillation with the digits that a readout writes. */
const deflectionRad = (row: number) => (2e-3 * Math.sin(row / 700) + 1e-7 * ((row * 7919) % 1000)).toFixed(9);
const instant = (row: number) => new Date(startUtcMs + row * intervalMs).toISOString();

function* rowsOf(rows: number, head: string, line: (row: number) => string): Generator<Buffer> {
  yield Buffer.from(head);
  for (let from = 0; from < rows; from += rowsAPiece) {
    let text = '';
    for (let row = from; row < Math.min(rows, from + rowsAPiece); row += 1) text += line(row);
    yield Buffer.from(text);
  }
}

const csvOf = (rows: number) => rowsOf(rows, 'time,deflection\n', (row) => `${instant(row)},${deflectionRad(row)}\n`);

const seconds = async (work: () => Promise<unknown>) => {
  const start = performance.now();
  await work();
  return (performance.now() - start) / 1000;
};

const channelOf = (name: string) => ({
  labId,
  rigId,
  runId: null,
  name,
  quantity: 'pendulum angle',
  unit: 'rad',
  role: 'deflection' as const,
  source: 'import' as const,
  createdAt: startUtcMs,
});

/** Keeps the file as the upload does, then measures what the commit of the import does. */
async function ingest(database: BenchDatabase, folder: string, rows: number): Promise<number> {
  const { connection } = database;
  const file = await beginImport(connection.db, { labId, runId, fileName: 'bench.csv', createdAt: startUtcMs, createdBy: 'bench' });
  const key = { labId, importId: file.id };
  const name = `import-${String(rows)}`;
  await pipeline(Readable.from(csvOf(rows)), createWriteStream(join(folder, name)));
  const window = { fromUtcMs: startUtcMs, toUtcMs: startUtcMs + rows * intervalMs };
  const work = {
    ...key,
    channel: channelOf(`file of ${String(rows)}`),
    storedAt: startUtcMs,
    ...{ mapping, columns: ['time', 'deflection'], by: 'bench' },
    window,
    choices: { sameInstant: 'refuse' as const, among: 'refuse' as const },
  };
  const limits = { nowUtcMs: startUtcMs + rows * intervalMs };
  const breathe = () => new Promise<void>((resolve) => void setImmediate(resolve));
  const cost = await seconds(async () => {
    const { stored } = await storeImport(connection, work, async (staging) => {
      const pieces = inTurns(new FolderObjects(folder).read(name), breathe);
      const reading = await readCsv(pieces, { mapping, limits, take: staging.take });
      if (reading.problemCount > 0) throw new Error(reading.problems[0]?.message);
      if ((await staging.farValues(greatestSpanRad)) !== null) throw new Error('a value lies out of reach');
      return { usualS: reading.medianIntervalS, leftOut: 0 };
    });
    if (stored !== rows) throw new Error(`${String(stored)} of ${String(rows)} rows were stored`);
  });
  return cost;
}

/** The same rows, written out beforehand, through COPY alone. */
async function copy(database: BenchDatabase, { rows, folder, name }: { rows: number; folder: string; name: string }): Promise<number> {
  const { id } = await store.findOrMakeChannel(database.connection.db, channelOf(`${name} of ${String(rows)}`));
  const path = join(folder, `${String(rows)}.csv`);
  const line = (row: number) => `${labId},${id},${instant(row)},${deflectionRad(row)}\n`;
  await pipeline(Readable.from(rowsOf(rows, '', line)), createWriteStream(path));
  if (statSync(path).size === 0) throw new Error('the file of the benchmark is empty');
  return seconds(() =>
    database.connection.bulk((client) =>
      pipeline(
        createReadStream(path, { highWaterMark: 1 << 20 }),
        client.query(copyFrom('copy samples (lab_id, channel_id, at, value) from stdin (format csv)')),
      ),
    ),
  );
}

async function prepare(database: BenchDatabase): Promise<void> {
  await seedLab(database);
  const start = {
    ...{ labId, runId, rigId, rigName: 'North bench', rigRevision: 1, rig: demoRigWide, massSetLabel: '', simulated: null, arm: null },
    ...{ protocolName: 'Bench', protocolRevision: 1, timeZone: 'Europe/Zurich', operator: 'bench', notes: '' },
    protocol: { formatVersion: 1 as const, name: 'Bench', steps: [{ kind: 'home' as const }] },
  };
  const row = {
    start,
    protocolId: null,
    massSetId: null,
    startedById: null,
    state: 'starting' as const,
    nowUtcMs: startUtcMs,
    predictedEndUtcMs: null,
  };
  if (!(await insertRun(database.connection.db, row))) throw new Error('the run of the benchmark was refused');
}

/** What a device's batches of a second cost a channel that holds so many samples already, ms each. */
async function appendSome({ connection }: BenchDatabase, rows: number, turn: number): Promise<number[]> {
  const { id } = await store.findOrMakeChannel(connection.db, channelOf(`file of ${String(rows)}`));
  const samples = createSampleStore(connection);
  const costs: number[] = [];
  for (let batch = turn * batchesATurn; batch < (turn + 1) * batchesATurn; batch += 1) {
    const utcMs = Float64Array.from({ length: 10 }, (_, index) => startUtcMs + (rows + 10 * batch + index) * intervalMs);
    costs.push(1000 * (await seconds(() => samples.append(labId, id, { utcMs, value: utcMs.map(Math.sin) }))));
  }
  return costs;
}

/** Half of the batches cost less. The sizes take turns, so that what PostgreSQL tidies up after so many rows falls on all alike. */
async function appendInTurns(database: BenchDatabase): Promise<{ size: number; cost: number }[]> {
  const costs = sizes.map((): number[] => []);
  for (let turn = 0; turn < turns; turn += 1)
    for (const [index, size] of sizes.entries()) costs[index]?.push(...(await appendSome(database, size, turn)));
  return sizes.map((size, index) => ({ size, cost: quantile(costs[index] ?? [], 0.5) }));
}

const greatestMemoryMiB = () => process.resourceUsage().maxRSS / 1024;

async function run(): Promise<void> {
  const folder = mkdtempSync(join(tmpdir(), 'evenfall-bench-ingest-'));
  try {
    await withDatabase(async (database) => {
      await prepare(database);
      await ingest(database, folder, 19_999);
      const points: { size: number; cost: number }[] = [];
      for (const rows of sizes) {
        // Before and after, so that the load of a shared machine falls on both alike.
        const before = await copy(database, { rows, folder, name: 'first copy' });
        const cost = await ingest(database, folder, rows);
        const peer = (2 * rows) / (before + (await copy(database, { rows, folder, name: 'second copy' })));
        points.push({ size: rows, cost });
        const value = rows / cost;
        report({ name: `ingest ${String(rows)}`, value, unit: 'rows/s', goal: 100_000, want: 'at least', peer });
        if (rows === sizes.at(-1))
          report({ name: 'ingest against COPY', value: value / peer, unit: '1', goal: 0.5, want: 'at least', peer: null });
      }
      report({ name: 'ingest growth', value: growth(points), unit: 'exponent', goal: 1.1, want: 'at most', peer: null });
      // When all is stored: writing out what was copied just before must not be taken for the size of a channel.
      await database.connection.pool.query('checkpoint');
      const appends = await appendInTurns(database);
      for (const { size, cost } of appends)
        report({ name: `ingest batch of a second after ${String(size)}`, value: cost, unit: 'ms', goal: null, want: 'told', peer: null });
      report({ name: 'ingest batch growth', value: growth(appends), unit: 'exponent', goal: 0.2, want: 'at most', peer: null });
      report({ name: 'ingest memory', value: greatestMemoryMiB(), unit: 'MiB', goal: 300, want: 'at most', peer: null });
    });
  } finally {
    rmSync(folder, { recursive: true });
  }
}

void run();
