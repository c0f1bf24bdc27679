import { fork, type ChildProcess } from 'node:child_process';
import { once } from 'node:events';
import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { decodeLine } from '@/firmware-protocol/codec';
import { buildServer } from '@/server/boot/build-server';
import { readConfig } from '@/server/boot/config';
import { RealClock } from '@/server/boot/real-clock';
import type { StationRig } from '@/server/interfaces/rig-stations';
import { createSimulatedController, type SimulatedController } from '@/server/links/simulated-controller';
import { withDatabase, type BenchDatabase } from './lib/fresh-database';
import { addMembers, seedLab } from './lib/people';
import type { StoppingSetting, StopSent } from './lib/stopping';
import { quantile, report } from './report';

/**
 * From a stop that a phone sends over loopback to its bytes handed to the line, for 200 runs: on an idle server, and with
 * 100 pages that follow the run while a million samples at a time are copied into the database. The peer is the time that
 * 16 bytes take on a wire of 115200 bit/s.
 */

const stops = 200;
const pages = 100;
const viewers = 20;
const wireMs = (16 * 10_000) / 115_200;

interface Watched {
  controller: SimulatedController;
  /** When stops were handed to the line, ns. */
  writtenNs: bigint[];
}

/** The simulated controller with an ear at the host's end of its line. */
function watchedController(clock: RealClock, rig: StationRig): Watched {
  if (rig.document.motion === undefined) throw new Error('the rig of the benchmark has no motion data');
  const controller = createSimulatedController({ clock, rig: rig.document.motion });
  const { factory } = controller;
  const writtenNs: bigint[] = [];
  const hear = (bytes: string) => {
    const item = decodeLine(bytes.trimEnd());
    if (item.kind === 'request' && item.order.word === 'stop') writtenNs.push(process.hrtime.bigint());
  };
  const open: typeof factory.open = async (handlers) => {
    const line = await factory.open(handlers);
    return {
      write: (bytes) => {
        hear(bytes);
        line.write(bytes);
      },
      close: () => line.close(),
    };
  };
  return { controller: { ...controller, factory: { ...factory, open } }, writtenNs };
}

const child = (name: string, argument: string): ChildProcess =>
  fork(join(__dirname, 'lib', `${name}.ts`), [argument], { execArgv: ['--import', 'tsx'] });

async function ended(process_: ChildProcess): Promise<void> {
  const [code] = (await once(process_, 'exit')) as [number | null];
  if (code !== 0) throw new Error('a process of the benchmark failed');
}

/** Lets another process stop runs; the time from each stop sent to the first bytes of it on the line, ms. */
async function stopRuns(setting: StoppingSetting, writtenNs: readonly bigint[]): Promise<number[]> {
  const stopping = child('stopping', JSON.stringify(setting));
  const sent: bigint[] = [];
  stopping.on('message', (message) => void sent.push(BigInt((message as StopSent).sentNs)));
  await ended(stopping);
  return sent.map((from) => {
    const at = writtenNs.find((ns) => ns >= from);
    if (at === undefined) throw new Error('a stop never came to the line');
    return Number(at - from) / 1e6;
  });
}

async function measure(database: BenchDatabase, stateDir: string): Promise<void> {
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
  const [[cookie], followers] = [await addMembers(database, 'operator'), await addMembers(database, 'viewer', viewers)];
  const clock = new RealClock();
  const watched: Watched[] = [];
  const controllerOf = (rig: StationRig) => {
    const one = watchedController(clock, rig);
    watched.push(one);
    return one.controller;
  };
  // Each run is armed anew: nobody has to leave the room meanwhile.
  const server = buildServer({
    database: database.connection,
    clock,
    config: { ...config, virtualExitDelayS: 0 },
    overrides: { controllerOf },
  });
  const address = await server.listen();
  await server.start();
  const { writtenNs } = watched[0] as Watched;
  const latency = (name: string, values: number[], goal: number) =>
    report({ name: `stop-latency ${name}`, value: quantile(values, 0.99), unit: 'ms p99', goal, want: 'at most', peer: wireMs });
  try {
    const setting = { address, cookie, viewers: followers, stops };
    latency('idle', await stopRuns({ ...setting, pages: 0 }, writtenNs), 50);
    const copying = child('copying', database.url);
    await once(copying, 'message');
    latency('copy', await stopRuns({ ...setting, pages }, writtenNs), 150);
    copying.disconnect();
    await ended(copying);
  } finally {
    await server.stop();
  }
}

async function run(): Promise<void> {
  const stateDir = mkdtempSync(join(tmpdir(), 'evenfall-bench-stop-'));
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
