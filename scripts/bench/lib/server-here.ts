import { mkdtempSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { connect } from '@/db/connect';
import { decodeLine, type Request } from '@/firmware-protocol/codec';
import { buildServer, type BuiltServer } from '@/server/boot/build-server';
import { readConfig } from '@/server/boot/config';
import { RealClock } from '@/server/boot/real-clock';
import type { StationRig } from '@/server/interfaces/rig-stations';
import { createSimulatedController, type SimulatedController } from '@/server/links/simulated-controller';
import { withDatabase, type BenchDatabase } from './fresh-database';
import { seedLab } from './people';

/** A server in this process, with the demo lab on a fresh database, that listens and can be looked into. */
export interface ServerHere {
  server: BuiltServer;
  address: string;
  database: BenchDatabase;
  clock: RealClock;
  /** Where it keeps files. */
  filesDir: string;
}

/** What leaves for the controller of a rig, order by order. */
export type Ear = (rigId: string, order: Request) => void;

/** The simulated controller of a rig with an ear at the host's end of its line. */
function watchedController(clock: RealClock, rig: StationRig, ear: Ear): SimulatedController {
  if (rig.document.motion === undefined) throw new Error('the rig of the benchmark has no motion data');
  const controller = createSimulatedController({ clock, rig: rig.document.motion });
  const { factory } = controller;
  const open: typeof factory.open = async (handlers) => {
    const line = await factory.open(handlers);
    return {
      write: (bytes) => {
        const item = decodeLine(bytes.trimEnd());
        if (item.kind === 'request') ear(rig.id, item);
        line.write(bytes);
      },
      close: () => line.close(),
    };
  };
  return { ...controller, factory: { ...factory, open } };
}

interface HereSetting {
  ear: Ear;
  prepare?: (database: BenchDatabase) => Promise<void>;
  /** Another address of the database, for the server alone. */
  through?: (url: string) => string;
}

/** Runs `work` on such a server, of which `prepare` may fill the database before it starts, and tidies up. */
export async function withServerHere(
  { ear, prepare = async () => undefined, through }: HereSetting,
  work: (here: ServerHere) => Promise<void>,
): Promise<void> {
  const stateDir = mkdtempSync(join(tmpdir(), 'evenfall-bench-server-'));
  try {
    await withDatabase(async (database) => {
      await seedLab(database);
      await prepare(database);
      const config = readConfig({
        NODE_ENV: 'production',
        DATABASE_URL: database.url,
        PORT: '0',
        EVENFALL_STATE_DIR: stateDir,
        EVENFALL_WEB_DIR: 'none',
        // A server whose database is taken away has much to say.
        EVENFALL_LOG_LEVEL: through === undefined ? 'error' : 'silent',
        EVENFALL_REQUESTS_PER_MINUTE: '1000000',
        EVENFALL_INTERVENTIONS_PER_MINUTE: '1000000',
      });
      const clock = new RealClock();
      const own = through === undefined ? database.connection : connect({ url: through(database.url), maxConnections: 10 });
      const server = buildServer({
        ...{ database: own, clock },
        // Nobody has to leave the room.
        config: { ...config, virtualExitDelayS: 0 },
        overrides: { controllerOf: (rig) => watchedController(clock, rig, ear) },
      });
      const address = await server.listen();
      await server.start();
      await work({ server, address, database, clock, filesDir: config.filesDir }).finally(async () => {
        await server.stop();
        if (own !== database.connection) await own.close();
      });
    });
  } finally {
    rmSync(stateDir, { recursive: true, force: true });
  }
}
