import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { withDatabase, type BenchDatabase } from './lib/fresh-database';
import { Follower } from './lib/follower';
import { LabClient, pause } from './lib/lab-client';
import { addMembers, seedLab } from './lib/people';
import { ServerProcess } from './lib/server-process';
import { quantile, report } from './report';

/**
 * Pages that follow one run with 5 events a second, and each of which loses its line once and comes back. The delay is
 * from the instant of an event, over the engine and the database, to its arrival; server and pages share the machine.
 */

const sizes = [100, 300, 1000];
const pagesAPerson = 6;
const measuredMs = 20_000;
const longestAwayMs = 2_000;
const openedAtOnce = 50;

/** A dwell that ends and one that begins: two events each 0.4 s. */
const busy: ProtocolDocument = {
  formatVersion: 1,
  name: 'Short dwells',
  steps: [{ kind: 'repeat', times: 5_000, steps: [{ kind: 'dwell', for_s: 0.4 }] }],
};

/** Loses the line at some instant of the first half and comes back as a browser does. */
async function comeBack(page: Follower, { runId, share }: { runId: string; share: number }): Promise<void> {
  await pause((share * measuredMs) / 2);
  page.leave();
  await pause(((share * 7) % 1) * longestAwayMs);
  await page.follow(runId);
}

/** Events that a page missed, or saw twice, between the first and the last that it saw. */
function wrongOf({ seqs }: Follower, lastSeq: number): number {
  const [first = lastSeq] = seqs;
  const seen = new Set(seqs);
  const missed = Array.from({ length: lastSeq - first + 1 }, (_, index) => first + index).filter((seq) => !seen.has(seq)).length;
  return missed + seqs.length - seen.size;
}

async function follow(pages: readonly Follower[], runId: string): Promise<void> {
  for (let from = 0; from < pages.length; from += openedAtOnce)
    await Promise.all(pages.slice(from, from + openedAtOnce).map((page) => page.follow(runId)));
}

async function measure(lab: LabClient, { runId, pages }: { runId: string; pages: readonly Follower[] }): Promise<void> {
  const size = pages.length;
  await follow(pages, runId);
  const back = pages.map((page, index) => comeBack(page, { runId, share: index / size }));
  await Promise.all([...back, pause(measuredMs)]);
  const { lastSeq } = await lab.run(runId);
  await pause(2_000);
  const wrong = pages.reduce((sum, page) => sum + wrongOf(page, lastSeq) + Number(page.ended), 0);
  for (const page of pages) page.leave();
  const delays = pages.flatMap(({ delaysMs }) => delaysMs);
  report({ name: `live ${String(size)}`, value: quantile(delays, 0.99), unit: 'ms p99', goal: 250, want: 'at most', peer: null });
  report({ name: `live ${String(size)} lost or repeated`, value: wrong, unit: 'events', goal: 0, want: 'at most', peer: null });
}

async function serve(database: BenchDatabase, stateDir: string): Promise<void> {
  const [operator] = await addMembers(database, 'operator');
  const viewers = await addMembers(database, 'viewer', Math.ceil(Math.max(...sizes) / pagesAPerson));
  const server = await ServerProcess.start({ databaseUrl: database.url, stateDir });
  try {
    const lab = new LabClient(server.address, operator);
    await lab.arm();
    const runId = await lab.start(await lab.issue(busy));
    for (const size of sizes) {
      const pages = Array.from({ length: size }, (_, index) => new Follower(server.address, viewers[index % viewers.length] as string));
      await measure(lab, { runId, pages });
    }
  } finally {
    await server.end();
  }
}

async function run(): Promise<void> {
  const stateDir = mkdtempSync(join(tmpdir(), 'evenfall-bench-live-'));
  try {
    await withDatabase(async (database) => {
      await seedLab(database);
      await serve(database, stateDir);
    });
  } finally {
    rmSync(stateDir, { recursive: true, force: true });
  }
}

void run();
