import { randomBytes } from 'node:crypto';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { Client } from 'pg';
import { connect } from '@/db/connect';
import { migrateToLatest } from '@/db/migrate';
import { sha256Hex } from '@/server/evaluation/sha256';
import { verifyChain } from '@/shared/archive/chain';
import type { ChainedEvent } from '@/shared/archive/run-records';
import { LabClient, pause } from '../../bench/lib/lab-client';
import { addMembers, seedLab } from '../../bench/lib/people';
import { ServerProcess, type ServerSetting } from '../../bench/lib/server-process';
import { eventsOf, swings } from '../../bench/lib/swings';
import { CrashingDatabase } from './crashing-database';

/** PostgreSQL stops at once, as in a power cut, at some instant of a run, and comes back seconds later. */

const SETTLING_MS = 40_000;
const AT_REST = ['held', 'running'];

interface Asked {
  lab: LabClient;
  runId: string;
}

export interface CrashFindings {
  told: Map<number, ChainedEvent>;
  answeredMs: number[];
  violations: string[];
}

async function freshUrl(database: CrashingDatabase): Promise<string> {
  const name = `evenfall_soak_${randomBytes(6).toString('hex')}`;
  const client = new Client({ connectionString: database.url.href });
  await client.connect();
  await client.query(`create database "${name}"`).finally(() => client.end());
  const url = new URL(database.url);
  url.pathname = `/${name}`;
  return url.href;
}

/** A hold or a stop over HTTP, with the cookie of a session and no database behind it. */
async function ask({ lab, runId }: Asked, what: 'hold' | 'stop', { answeredMs, violations }: CrashFindings): Promise<void> {
  const began = performance.now();
  const status = await lab.intervene(runId, what).then(
    (answer) => answer.status,
    (error: Error) => error.message,
  );
  answeredMs.push(performance.now() - began);
  if (status !== 202) violations.push(`the ${what} without a database was answered ${String(status)}`);
}

async function round(asked: Asked, database: CrashingDatabase, of: { number: number; findings: CrashFindings }): Promise<void> {
  const { lab, runId } = asked;
  const { number, findings } = of;
  await pause(500 + ((number * 0.618) % 1) * 6_000);
  for (const event of await eventsOf(lab, runId)) findings.told.set(event.seq, event);
  await database.crash();
  const holds = number % 3 === 2;
  if (holds) await ask(asked, 'hold', findings);
  await pause(((number * 0.414) % 1) * 9_000);
  await database.recover();
  const began = performance.now();
  for (;;) {
    const view = await lab.run(runId).catch(() => null);
    if (view !== null && AT_REST.includes(view.state) && !view.reason.includes('away since') && (!holds || view.state === 'held')) break;
    if (performance.now() - began > SETTLING_MS) {
      findings.violations.push(`round ${number}: the run is ${view?.state ?? 'not to be read'}: ${view?.reason ?? ''}`);
      return;
    }
    await pause(100);
  }
  if (holds) await lab.resume(runId);
}

async function rounds(setting: ServerSetting, cookie: string, of: { database: CrashingDatabase; count: number }): Promise<CrashFindings> {
  const findings: CrashFindings = { told: new Map(), answeredMs: [], violations: [] };
  let server = await ServerProcess.start(setting);
  try {
    let lab = new LabClient(server.address, cookie);
    await lab.arm();
    const runId = await lab.start(await lab.issue(swings));
    for (let number = 0; number < of.count; number += 1) await round({ lab, runId }, of.database, { number, findings });
    await of.database.crash();
    await ask({ lab, runId }, 'stop', findings);
    await server.end('SIGKILL');
    await of.database.recover();
    server = await ServerProcess.start(setting);
    lab = new LabClient(server.address, cookie);
    await lab.until(runId, ({ state }) => state === 'stopped');
    judge(await eventsOf(lab, runId), findings);
  } finally {
    await server.end();
  }
  return findings;
}

function judge(events: readonly ChainedEvent[], { told, violations }: CrashFindings): void {
  if (!verifyChain(events, sha256Hex).valid) violations.push('the chain does not hold');
  const kept = new Map(events.map(({ seq, hash }) => [seq, hash]));
  const lost = [...told.values()].filter(({ seq, hash }) => kept.get(seq) !== hash);
  if (lost.length > 0) violations.push(`${lost.length} events that were told are lost, the first of them ${lost[0]?.seq ?? 0}`);
  if (!events.some(({ kind }) => kind === 'stop-requested'))
    violations.push('the stop that was answered without a database is not in the log');
}

/**
 * A run on a cluster of its own with the name, which crashes in it `count` times and once more at the end. Every third time somebody holds over HTTP
 * meanwhile. At the end the run is stopped over HTTP without a database, and the server is killed before it is back.
 */
export async function crashRounds(name: string, count: number): Promise<CrashFindings> {
  const database = await CrashingDatabase.start(name);
  const stateDir = mkdtempSync(join(tmpdir(), 'evenfall-soak-r4-'));
  try {
    const databaseUrl = await freshUrl(database);
    const connection = connect({ url: databaseUrl, maxConnections: 2 });
    await migrateToLatest(connection);
    await seedLab({ url: databaseUrl, connection });
    const [cookie] = await addMembers({ url: databaseUrl, connection }, 'operator');
    await connection.close();
    return await rounds({ databaseUrl, stateDir, env: { EVENFALL_LOG_LEVEL: 'fatal' } }, cookie, { database, count });
  } finally {
    await database.end();
    rmSync(stateDir, { recursive: true, force: true });
  }
}
