import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { demoIds, demoPeople } from '@/db/demo/seed';
import { arms, rigLinks } from '@/db/schema';
import { sha256Hex } from '@/server/evaluation/sha256';
import { verifyChain } from '@/shared/archive/chain';
import type { ChainedEvent } from '@/shared/archive/run-records';
import { withDatabase, type BenchDatabase } from '../../bench/lib/fresh-database';
import { LabClient, pause } from '../../bench/lib/lab-client';
import { addMembers, seedLab } from '../../bench/lib/people';
import { ServerProcess, type ServerSetting } from '../../bench/lib/server-process';
import { eventsOf, swings } from '../../bench/lib/swings';
import { WatchedController } from './watched-controller';

/** A run of swings on a real database and on a controller that outlives the servers, with what it has told so far. */
export interface RealNight {
  /** Of a server by its number, which its connections to the database bear as their name. */
  setting(number?: number, place?: number): ServerSetting;
  database: BenchDatabase;
  cookie: string;
  controller: WatchedController;
  runId: string;
  told: Map<number, ChainedEvent>;
}

/** The exit delay of a rig that stands in a room is 2 min. */
const armPatienceMs = 150_000;
const driverPatienceMs = 30_000;

interface NightOptions {
  /** Somebody armed the rig before the first server began: nobody waits for an exit delay. */
  armed?: boolean;
  /** Address at which the servers find their database. */
  through?: (url: string) => string;
  /** Told the ports of database and controller; what the setting of a server has besides, by its place. */
  besides?: (ports: readonly number[]) => Promise<(place: number) => Partial<ServerSetting>>;
}

/** Begins such a run under one server, gives both to `work`, which has the server from then on, and tidies up. */
export function withRealNight<T>(
  work: (night: RealNight, first: ServerProcess) => Promise<T>,
  { armed = false, through = (url) => url, besides }: NightOptions = {},
): Promise<T> {
  const folder = mkdtempSync(join(tmpdir(), 'evenfall-soak-night-'));
  return withDatabase(async (database) => {
    const controller = await WatchedController.start();
    try {
      await seedLab(database);
      const settings = { kind: 'tcp' as const, host: '127.0.0.1', port: controller.port, mode: 'raw' as const, baudRate: 115_200 as const };
      await database.connection.db.update(rigLinks).set({ settings });
      const [cookie] = await addMembers(database, 'operator');
      const more = await besides?.([Number(new URL(database.url).port), controller.port]);
      const setting = (number = 0, place = 0): ServerSetting => {
        const { env, ...rest } = more?.(place) ?? {};
        return {
          databaseUrl: named(through(database.url), number),
          stateDir: join(folder, String(number)),
          env: { EVENFALL_LOG_LEVEL: 'silent', ...env },
          ...rest,
        };
      };
      if (armed) await armBefore(database, controller);
      const first = await ServerProcess.start(setting());
      const lab = new LabClient(first.address, cookie);
      if (armed) await lab.sign();
      else await lab.arm({ turnKey: async (on) => controller.turnArmKey(on), patienceMs: armPatienceMs });
      const runId = await lab.start(await lab.issue(swings));
      return await work({ setting, database, cookie, controller, runId, told: new Map() }, first);
    } finally {
      controller.end();
    }
  }).finally(() => rmSync(folder, { recursive: true, force: true }));
}

function named(url: string, number: number): string {
  const own = new URL(url);
  own.searchParams.set('application_name', `evenfall ${String(number)}`);
  return own.href;
}

async function armBefore({ connection: { db } }: BenchDatabase, controller: WatchedController): Promise<void> {
  controller.turnArmKey(true);
  const armedById = demoPeople.find(({ role }) => role === 'operator')?.id ?? '';
  const fromAt = Date.now();
  const untilAt = fromAt + 12 * 3_600_000;
  await db.insert(arms).values({ labId: demoIds.lab, rigId: demoIds.rig, name: 'Ilse Marrowby', fromAt, untilAt, armedById });
}

/** Keeps what the run tells now: none of it may be gone later. */
export async function listen({ cookie, runId, told }: RealNight, server: ServerProcess): Promise<void> {
  for (const event of await eventsOf(new LabClient(server.address, cookie), runId)) told.set(event.seq, event);
}

/** Looks at the living servers until one drives the rig with a line that answers. */
export async function driverOf(servers: readonly ServerProcess[], { cookie }: RealNight): Promise<ServerProcess> {
  for (const began = performance.now(); performance.now() - began < driverPatienceMs; await pause(50)) {
    for (const server of servers) {
      const { body } = await new LabClient(server.address, cookie).read(`/labs/${demoIds.lab}/rigs/${demoIds.rig}`);
      if ((body as { live: { condition: string } }).live.condition === 'ready') return server;
    }
  }
  throw new Error('nobody drives the rig');
}

/** What is wrong with the record at the end. */
export async function judged(night: RealNight, server: ServerProcess): Promise<string[]> {
  const { cookie, runId, told, controller } = night;
  const events = await eventsOf(new LabClient(server.address, cookie), runId);
  const kept = new Map(events.map(({ seq, hash }) => [seq, hash]));
  const lost = [...told.values()].filter(({ seq, hash }) => kept.get(seq) !== hash);
  return [
    ...controller.violations,
    ...(verifyChain(events, sha256Hex).valid ? [] : ['the chain does not hold']),
    ...(lost.length === 0 ? [] : [`${lost.length} events that were told are lost, the first of them ${lost[0]?.seq ?? 0}`]),
  ];
}

export const countOf = (args: readonly string[], { first, second }: { first: number; second: number }): number => {
  const at = args.indexOf('--rounds');
  return at >= 0 ? Number(args[at + 1]) : args.includes('--second') ? second : first;
};
