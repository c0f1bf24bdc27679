import { fork } from 'node:child_process';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { buildServer, type BuiltServer } from '@/server/boot/build-server';
import { readConfig } from '@/server/boot/config';
import { RealClock } from '@/server/boot/real-clock';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { withDatabase, type BenchDatabase } from './lib/fresh-database';
import { LabClient, pause } from './lib/lab-client';
import { manyRigs } from './lib/more-rigs';
import { addMembers, seedLab } from './lib/people';
import { growth, quantile, report } from './report';

/**
 * Up to 100 simulated rigs in one process, each with a run whose steps follow every 10 s and a deflection of 10 samples a second, on a real
 * database. How late a step is: from its instant until it is stored and acted on. The peer is a process that does nothing but wait.
 */

const sizes = [25, 50, 100];
const settlingMs = 5_000;
const measuredMs = 30_000;

/** Dwells of 10 s and, in between, swings that take about as long. */
const steady: ProtocolDocument = {
  formatVersion: 1,
  name: 'A step each 10 s',
  steps: [
    { kind: 'home' },
    {
      kind: 'repeat',
      times: 500,
      steps: [
        { kind: 'swing', to: 'near' },
        { kind: 'dwell', for_s: 10 },
        { kind: 'swing', to: 'far' },
        { kind: 'dwell', for_s: 10 },
      ],
    },
  ],
};

interface Figures {
  lateMs: number[];
  /** Share of one core. */
  core: number;
  /** What the timers of an idle process were late by, ms. */
  bareMs: number[];
}

async function watch(server: BuiltServer): Promise<Figures> {
  await pause(settlingMs);
  const [lateMs, bareMs]: [number[], number[]] = [[], []];
  const peer = fork(join(__dirname, 'lib', 'bare-timer.ts'), [], { execArgv: ['--import', 'tsx'] });
  peer.on('message', (late) => bareMs.push(...(late as number[])));
  const leave = server.services.supervisor.onChange((_, { events }) => {
    const nowMs = Date.now();
    for (const { kind, at } of events) if (kind === 'step-began') lateMs.push(nowMs - Date.parse(at));
  });
  const [before, beganMs] = [process.cpuUsage(), performance.now()];
  await pause(measuredMs);
  const { user, system } = process.cpuUsage(before);
  const core = (user + system) / 1000 / (performance.now() - beganMs);
  leave();
  peer.disconnect();
  return { lateMs, core, bareMs };
}

async function measure(database: BenchDatabase, stateDir: string): Promise<void> {
  const rigs = await manyRigs(database, Math.max(...sizes));
  const [cookie] = await addMembers(database, 'operator');
  const config = readConfig({
    NODE_ENV: 'production',
    DATABASE_URL: database.url,
    PORT: '0',
    EVENFALL_STATE_DIR: stateDir,
    EVENFALL_WEB_DIR: 'none',
    EVENFALL_LOG_LEVEL: 'error',
    EVENFALL_REQUESTS_PER_MINUTE: '1000000',
    EVENFALL_INTERVENTIONS_PER_MINUTE: '1000000',
  });
  const server = buildServer({
    ...{ database: database.connection, clock: new RealClock() },
    config: { ...config, virtualExitDelayS: 0 },
  });
  const address = await server.listen();
  await server.start();
  try {
    const points: { size: number; cost: number }[] = [];
    let running = 0;
    for (const size of sizes) {
      for (; running < size; running += 1) {
        const lab = new LabClient(address, cookie, rigs[running]);
        await lab.arm();
        await lab.start(await lab.issue(steady));
      }
      const { lateMs, core, bareMs } = await watch(server);
      const [name, peer] = [`many-rigs ${String(size)}`, quantile(bareMs, 0.99)];
      report({ name: `${name} lateness`, value: quantile(lateMs, 0.99), unit: 'ms p99', goal: 20, want: 'at most', peer });
      report({ name: `${name} core`, value: 100 * core, unit: '% of a core', goal: 60, want: 'at most', peer: null });
      points.push({ size, cost: core });
    }
    report({ name: 'many-rigs growth', value: growth(points), unit: 'exponent', goal: 1.2, want: 'at most', peer: null });
  } finally {
    await server.stop();
  }
}

async function run(): Promise<void> {
  const stateDir = mkdtempSync(join(tmpdir(), 'evenfall-bench-rigs-'));
  try {
    await withDatabase(async (database) => {
      await seedLab(database);
      await measure(database, stateDir);
    });
  } finally {
    rmSync(stateDir, { recursive: true, force: true });
  }
}

void run();
