import { mkdtempSync, readdirSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { setTimeout as pause } from 'node:timers/promises';
import { join } from 'node:path';
import { simpleParser, type ParsedMail } from 'mailparser';
import { demoPeople, seedDemo } from '@/db/demo/seed';
import { hashPassword } from '@/server/auth/passwords';
import { sha256Hex } from '@/server/evaluation/sha256';
import { startDemoMailbox, type DemoMailbox } from '@/server/notify/demo-mailbox';
import { createSmtpMail } from '@/server/notify/smtp-mail';
import type { Role } from '@/shared/contracts/roles';
import { openBrowser, type Browser, type BrowserOptions, type Size } from '../../support/browser';
import { freshDatabase, type TestDatabase } from '../../support/database';
import { LabServer, World } from '../../support/lab-server';
import { withoutDatabase } from '../../support/without-database';
import { listensAgain } from './one-address';

const webDir = join(__dirname, '../../../dist');
/** What a server takes of the clock until its lines are open, ms. */
const beginsMs = 5_000;
/** How often virtual time is made to follow the clock on the wall, ms. */
const tickMs = 100;

interface LabParts {
  address: string;
  database: TestDatabase;
  mailbox: DemoMailbox;
  start(): Promise<LabServer>;
  closeMail(): void;
}

/**
 * The demo lab as people meet it: the whole server behind a port on loopback, a mail server, browsers. Its time follows
 * the clock on the wall, so that pages are alive, and jumps when a test lets time pass.
 */
export class Lab {
  readonly browsers = new Set<Browser>();
  private turn: Promise<void> = Promise.resolve();
  private ticker: NodeJS.Timeout | null = null;
  private tickedMs = performance.now();

  private constructor(
    private running: LabServer,
    private readonly parts: LabParts,
  ) {}

  get server(): LabServer {
    return this.running;
  }

  get address(): string {
    return this.parts.address;
  }

  static async start(): Promise<Lab> {
    const database = await freshDatabase();
    // Cookies carry absolute dates, so the lab's evening begins at the present of the browser's machine.
    const world = new World(Date.now());
    await seedDemo(database.connection, { nowUtcMs: world.clock.utcMs(), hashPassword, sha256: sha256Hex, link: 'simulated' });
    const mailbox = await startDemoMailbox({ folder: mkdtempSync(join(tmpdir(), 'evenfall-mail-')), clock: world.clock });
    const mail = createSmtpMail({ url: mailbox.url, from: 'Evenfall <evenfall@quillfen.example>' });
    const start = () => LabServer.start(database, { world, config: { webDir, virtualExitDelayS: 120 }, overrides: { mail } });
    const server = await start();
    const lab = new Lab(server, { address: await listensAgain(server.built), database, mailbox, start, closeMail: () => mail.close() });
    lab.letTimeFlow();
    return lab;
  }

  /** The server ends, `seconds` go by at the rig, and another server begins at the same address. */
  restarts(seconds: number): Promise<void> {
    return this.inTurn(async () => {
      const { world } = this.running;
      await this.running.stop();
      await this.shiftDevices(seconds * 1000);
      await world.clock.advance(seconds * 1000);
      this.running = await this.parts.start();
      await this.shiftDevices(beginsMs);
      await listensAgain(this.running.built);
    });
  }

  /** Lets lab time pass while the database does not answer, then flow as long as somebody looks, then until it is found again. */
  passWithoutDatabase(seconds: number, meanwhile: () => Promise<void>): Promise<void> {
    return this.inTurn(() =>
      withoutDatabase(this.running, async () => {
        await this.shiftDevices(seconds * 1000);
        await this.running.advance(seconds * 1000);
        let looks = true;
        const looking = meanwhile().finally(() => (looks = false));
        while (looks) {
          await pause(tickMs);
          await this.running.advance(tickMs);
        }
        await looking;
      }),
    );
  }

  /** Lets lab time pass at once, or until a condition holds. Open pages see their device's clock go along. */
  pass(seconds: number, until?: () => boolean): Promise<void> {
    return this.inTurn(async () => {
      const { clock } = this.server;
      const endMs = clock.utcMs() + seconds * 1000;
      // Ahead of the lab rather than behind it: what arrives meanwhile must not look as if it came from the future.
      await this.shiftDevices(seconds * 1000);
      await this.server.advance(seconds * 1000, until);
      if (clock.utcMs() < endMs) await this.shiftDevices(clock.utcMs() - endMs);
    });
  }

  /** Stops the flow of time until the returned function is called. */
  freeze(): () => void {
    clearInterval(this.ticker ?? undefined);
    this.ticker = null;
    return () => this.letTimeFlow();
  }

  /** A browser, signed in where a role is given; `address` is where a network of its own begins. */
  async open(
    size: Size,
    role?: Role,
    { address = this.address, ...options }: BrowserOptions & { address?: string } = {},
  ): Promise<Browser> {
    const browser = await openBrowser(address, size, options);
    this.browsers.add(browser);
    if (role !== undefined) await this.enter(browser, role);
    return browser;
  }

  /** Gives the browser a session of the demo's member with this role, without the sign-in page. */
  async enter({ context }: Browser, role: Role): Promise<void> {
    const [name = '', value = ''] = this.server.cookie(role).split('=');
    await context.clearCookies();
    await context.addCookies([{ name, value, url: this.address, httpOnly: true, sameSite: 'Lax' }]);
  }

  /** Ends all sessions of the demo's member with this role, as a password reset elsewhere does; what a test asks of the API goes on with a new one. */
  async endSessions(role: Role): Promise<void> {
    const { id } = person(role);
    await this.server.services.sessions.endAllOf(id);
    await this.server.signIn(id);
  }

  /** The newest mail to an address, or null. */
  async mailTo(address: string): Promise<ParsedMail | null> {
    const name = readdirSync(this.parts.mailbox.folder)
      .filter((file) => file.endsWith(`${address}.eml`))
      .sort()
      .at(-1);
    return name === undefined ? null : simpleParser(readFileSync(join(this.parts.mailbox.folder, name)));
  }

  async close(browser: Browser): Promise<void> {
    this.browsers.delete(browser);
    await browser.close();
  }

  async stop(): Promise<void> {
    this.freeze();
    await this.turn;
    for (const browser of this.browsers) await this.close(browser);
    await this.server.stop();
    this.parts.closeMail();
    await this.parts.mailbox.close();
    rmSync(this.parts.mailbox.folder, { recursive: true, force: true });
    await this.parts.database.drop();
  }

  private async shiftDevices(ms: number): Promise<void> {
    for (const { page } of this.browsers) await page.evaluate(shiftDeviceClock, ms);
  }

  private letTimeFlow(): void {
    this.tickedMs = performance.now();
    let busy = false;
    this.ticker ??= setInterval(() => {
      if (busy) return;
      busy = true;
      void this.inTurn(async () => {
        const nowMs = performance.now();
        await this.server.advance(nowMs - this.tickedMs);
        this.tickedMs = nowMs;
      }).finally(() => {
        busy = false;
      });
    }, tickMs);
  }

  /** Two hands on one clock would let it run backwards. */
  private inTurn(work: () => Promise<void>): Promise<void> {
    const mine = this.turn.then(work);
    this.turn = mine.catch(() => undefined);
    return mine;
  }
}

/** Runs in the page: its device goes ahead by as much as the lab did. */
function shiftDeviceClock(ms: number): void {
  const before = Date.now.bind(Date);
  Date.now = () => before() + ms;
}

export const person = (role: Role) => {
  const found = demoPeople.find((one) => one.role === role);
  if (found === undefined) throw new Error(`the demo has no ${role}`);
  return found;
};

/** One lab for the tests of a file. */
export function labOfThisFile(): () => Lab {
  let lab: Lab | undefined;
  beforeAll(async () => {
    lab = await Lab.start();
  }, 60_000);
  afterAll(async () => {
    await lab?.stop();
  }, 60_000);
  return () => {
    if (lab === undefined) throw new Error('the lab is opened in beforeAll: ask for it inside a test');
    return lab;
  };
}
