import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { sha256Hex } from '@/server/evaluation/sha256';
import { verifyChain } from '@/shared/archive/chain';
import type { ChainedEvent } from '@/shared/archive/run-records';
import { withDatabase, type BenchDatabase } from './lib/fresh-database';
import { LabClient, pause } from './lib/lab-client';
import { addMembers, seedLab } from './lib/people';
import { eventsOf, swings } from './lib/swings';
import { ServerProcess, type ServerSetting } from './lib/server-process';
import { quantile, report } from './report';

/**
 * Kills the server (SIGKILL) at some instant of a run of swings and dwells and starts it anew at once, ten times: the time
 * from the kill until the run is carried on, and whether its record is whole in the end.
 */

const kills = 10;
const longestCalmMs = 8_000;

/** What the run had told before each kill must stand in the chain, the chain must hold, and each kill must have left its mark. */
function wrongIn(events: readonly ChainedEvent[], told: readonly ChainedEvent[]): number {
  const kept = new Map(events.map(({ seq, hash }) => [seq, hash]));
  const lost = told.filter(({ seq, hash }) => kept.get(seq) !== hash).length;
  const unmarked = kills - events.filter(({ kind }) => kind === 'server-restarted').length;
  return lost + Math.abs(unmarked) + (verifyChain(events, sha256Hex).valid ? 0 : 1);
}

async function killOften(setting: ServerSetting, cookie: string): Promise<void> {
  let server = await ServerProcess.start(setting);
  try {
    let lab = new LabClient(server.address, cookie);
    await lab.arm();
    const runId = await lab.start(await lab.issue(swings));
    const carriedOnS: number[] = [];
    const told = new Map<number, ChainedEvent>();
    for (let number = 0; number < kills; number += 1) {
      await pause(500 + ((number * 0.618) % 1) * longestCalmMs);
      for (const event of await eventsOf(lab, runId)) told.set(event.seq, event);
      const began = performance.now();
      await server.end('SIGKILL');
      server = await ServerProcess.start(setting);
      lab = new LabClient(server.address, cookie);
      const last = Math.max(...told.keys());
      await lab.until(runId, ({ state, lastSeq, current }) => state === 'running' && lastSeq > last && current !== null);
      carriedOnS.push((performance.now() - began) / 1000);
    }
    report({ name: 'restart', value: quantile(carriedOnS, 0.99), unit: 's p99', goal: 5, want: 'at most', peer: null });
    const wrong = wrongIn(await eventsOf(lab, runId), [...told.values()]);
    report({ name: 'restart lost or unmarked', value: wrong, unit: 'events', goal: 0, want: 'at most', peer: null });
  } finally {
    await server.end();
  }
}

async function measure(database: BenchDatabase): Promise<void> {
  const stateDir = mkdtempSync(join(tmpdir(), 'evenfall-bench-restart-'));
  try {
    await seedLab(database);
    const [cookie] = await addMembers(database, 'operator');
    await killOften({ databaseUrl: database.url, stateDir }, cookie);
  } finally {
    rmSync(stateDir, { recursive: true, force: true });
  }
}

void withDatabase(measure);
