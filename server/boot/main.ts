import { connect } from '@/db/connect';
import { demoPassword, demoPeople, seedDemo } from '@/db/demo/seed';
import { migrateToLatest } from '@/db/migrate';
import { join } from 'node:path';
import { hashPassword } from '../auth/passwords';
import { sha256Hex } from '../evaluation/sha256';
import type { ServerConfig } from '../interfaces/server-config';
import { startDemoMailbox, type DemoMailbox } from '../notify/demo-mailbox';
import { createSmtpMail } from '../notify/smtp-mail';
import { buildServer } from './build-server';
import { ConfigError, readConfig } from './config';
import { queueDemoRehearsal } from './demo-rehearsal';
import { RealClock } from './real-clock';
import { startWatchdog } from './watchdog';

/** The server as a process: configuration, database, demo lab, one line on stdout once it listens, and a clean end. */

const longestEndMs = 1_900;
/** A frozen process must not keep the rows of a run locked for as long as an outage would take to count. */
const engineIdleMs = 2_000;

function configuration(): ServerConfig {
  try {
    return readConfig(process.env);
  } catch (error) {
    if (!(error instanceof ConfigError)) throw error;
    process.stderr.write(`${error.message}\n`);
    return process.exit(2);
  }
}

async function main(): Promise<void> {
  const config = configuration();
  const clock = new RealClock();
  const database = connect({ url: config.databaseUrl, maxConnections: 20 });
  const engineDatabase = connect({ url: config.databaseUrl, maxConnections: 4, idleInTransactionMs: engineIdleMs });
  await migrateToLatest(database);
  if (config.demo && (await seedDemo(database, { nowUtcMs: clock.utcMs(), hashPassword, sha256: sha256Hex }))) {
    await queueDemoRehearsal(database, clock.utcMs());
  }
  const mailbox = config.demo && config.smtpUrl === null ? await startDemoMailbox({ folder: join(config.stateDir, 'mail'), clock }) : null;
  const smtpUrl = config.smtpUrl ?? mailbox?.url ?? null;
  const mail = smtpUrl === null ? null : createSmtpMail({ url: smtpUrl, from: config.mailFrom });
  const server = buildServer({ database, engineDatabase, clock, config, overrides: mail === null ? {} : { mail } });

  let ending = false;
  const end = () => {
    if (ending) return;
    ending = true;
    setTimeout(() => process.exit(0), longestEndMs).unref();
    void endAll([
      () => server.stop(),
      () => mailbox?.close(),
      () => mail?.close(),
      () => engineDatabase.close(),
      () => database.close(),
    ]).then(() => process.exit(0));
  };
  process.on('SIGINT', end);
  process.on('SIGTERM', end);

  // Where a debugger stands still, a loop does too.
  if (config.mode === 'production') startWatchdog({ slowMs: 1_000, longestMs: 1_000 * config.watchdogS });

  const address = config.roles.includes('web') ? await server.listen() : await server.listenToWatchers().then(() => null);
  process.stdout.write(`${JSON.stringify(greeting(config, address, mailbox))}\n`);
  await server.start().catch((error: unknown) => {
    // What was still being taken up when the end came is let go of.
    if (!ending) throw error;
  });
}

/** One after another; what fails to end does not keep the rest from ending. */
async function endAll(ends: readonly (() => unknown)[]): Promise<void> {
  for (const endOne of ends) {
    try {
      await endOne();
    } catch (error) {
      process.stderr.write(`${String(error)}\n`);
    }
  }
}

/** What the start script reads and shows. */
function greeting(config: ServerConfig, address: string | null, mailbox: DemoMailbox | null): object {
  const signIns = config.demo && address !== null ? demoPeople.map(({ email, role }) => ({ email, role, password: demoPassword })) : [];
  return { listening: address, roles: config.roles, signIns, ...(mailbox === null ? {} : { mailbox: mailbox.folder }) };
}

main().catch((error: unknown) => {
  process.stderr.write(`The server cannot start: ${error instanceof Error ? (error.stack ?? error.message) : String(error)}\n`);
  process.exit(1);
});
