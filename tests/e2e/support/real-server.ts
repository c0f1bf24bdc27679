import { join } from 'node:path';
import { demoPeople, seedDemo } from '@/db/demo/seed';
import { buildServer, type BuiltServer } from '@/server/boot/build-server';
import { heavyTasks } from '@/server/boot/heavy-tasks';
import { RealClock } from '@/server/boot/real-clock';
import type { Role } from '@/shared/contracts/roles';
import { openBrowser, type Browser, type Size } from '../../support/browser';
import { freshDatabase, type TestDatabase } from '../../support/database';
import { sha256, testConfig } from '../../support/lab-server';
import { listensAgain } from './one-address';

/** The demo lab in real time, for what cannot be hurried: a real port and a process behind it. */
export class RealServer {
  private constructor(
    readonly address: string,
    private readonly built: BuiltServer,
    private readonly database: TestDatabase,
  ) {}

  /** `link`: what the demo rig's line leads to. */
  static async start(link: 'simulated' | 'board' = 'simulated'): Promise<RealServer> {
    const database = await freshDatabase();
    const clock = new RealClock();
    const hashPassword = async () => 'no password in this test';
    await seedDemo(database.connection, { nowUtcMs: clock.utcMs(), hashPassword, sha256, link });
    const config = testConfig(database, { webDir: join(__dirname, '../../../dist'), virtualExitDelayS: 1 });
    const built = buildServer({
      database: database.connection,
      clock,
      config,
      overrides: { tasks: heavyTasks, ticks: false, exitDelayMs: 1_000 },
    });
    await built.start();
    return new RealServer(await listensAgain(built), built, database);
  }

  get services(): BuiltServer['services'] {
    return this.built.services;
  }

  /** A browser with a session of the demo's member with this role. */
  async open(size: Size, role: Role): Promise<Browser> {
    const userId = demoPeople.find((one) => one.role === role)?.id ?? '';
    const { token } = await this.services.sessions.create(userId, { userAgent: 'test', ip: '127.0.0.1' });
    const browser = await openBrowser(this.address, size);
    await browser.context.addCookies([{ name: 'ef', value: token, url: this.address, httpOnly: true, sameSite: 'Lax' }]);
    return browser;
  }

  async stop(): Promise<void> {
    await this.built.stop();
    await this.database.drop();
  }
}
