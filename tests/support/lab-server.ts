import { createHash, randomUUID } from 'node:crypto';
import { tmpdir } from 'node:os';
import request from 'supertest';
import { demoIds, demoPeople, seedDemo } from '@/db/demo/seed';
import { heavyTasks } from '@/server/boot/heavy-tasks';
import type { BuildOverrides } from '@/server/boot/build-parts';
import { buildServer, type BuiltServer } from '@/server/boot/build-server';
import { MemoryJournals } from '@/server/engine/memory-journal';
import { VirtualClock } from '@/server/engine/virtual-clock';
import type { RigStation, StationRig } from '@/server/interfaces/rig-stations';
import type { StandingJournal } from '@/server/interfaces/standing-journal';
import type { ServerConfig } from '@/server/interfaces/server-config';
import { resumeSubject, startSubject } from '@/server/http/reviews';
import { createSimulatedController, type SimulatedController } from '@/server/links/simulated-controller';
import type { Role } from '@/shared/contracts/roles';
import type { RunState, RunView } from '@/shared/contracts/runs';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { cautionsVersion } from '@/shared/rig/cautions';
import type { TestDatabase } from './database';
import { MemoryObjects } from './memory-objects';
import { MemoryStanding } from './memory-standing';

export const sha256 = (text: string) => createHash('sha256').update(text).digest('hex');

/** A clear evening in the lab's winter. */
const eveningUtcMs = Date.UTC(2031, 1, 14, 20);

export interface LabServerOptions {
  overrides?: BuildOverrides;
  config?: Partial<ServerConfig>;
  /** Without it a clock of its own. */
  clock?: VirtualClock;
}

export const testConfig = (database: TestDatabase, changes: Partial<ServerConfig> = {}): ServerConfig => ({
  mode: 'test',
  roles: ['web', 'rig', 'worker'],
  databaseUrl: database.url,
  ...{ host: '127.0.0.1', port: 0, publicUrl: null, trustedProxies: 0, demo: true },
  ...{ virtualExitDelayS: 5, watchdogS: 3 },
  stateDir: tmpdir(),
  ...{ webDir: null, filesDir: tmpdir(), databaseDir: null, s3: null, secretKey: 'the key of the servers of tests: no secret' },
  smtpUrl: null,
  mailFrom: 'Evenfall <evenfall@quillfen.example>',
  ...{ privateHosts: [], cameraHosts: [], metricsPort: null, logLevel: 'silent' },
  limits: {
    requestsPerMinute: 1_000_000,
    interventionsPerMinute: 1_000_000,
    jsonBytes: 1_048_576,
    importBytes: 4_194_304,
    streamsPerUser: 6,
  },
  devices: { batchBytes: 1_048_576, batchesPerMinute: 120, samplesPerMinute: 120_000 },
  ...changes,
});

/** Something that lives on when a server ends: the clock and the turntables. */
export class World {
  private server: BuiltServer | null = null;
  private databaseAway = false;
  private readonly controllers = new Map<string, SimulatedController>();
  readonly clock: VirtualClock;
  readonly journals = new MemoryJournals();
  readonly standing: StandingJournal = new MemoryStanding();

  constructor(startUtcMs: number = eveningUtcMs) {
    this.clock = new VirtualClock(startUtcMs, () => this.settle());
  }

  readonly controllerOf = (rig: StationRig): SimulatedController => {
    const known = this.controllers.get(rig.id);
    if (known !== undefined) return known;
    const { motion } = rig.document;
    if (motion === undefined) throw new Error('the rig of a test has motion data');
    const controller = createSimulatedController({ clock: this.clock, rig: motion, seed: 7 });
    this.controllers.set(rig.id, controller);
    return controller;
  };

  controller(rigId: string): SimulatedController {
    const controller = this.controllers.get(rigId);
    if (controller === undefined) throw new Error(`no turntable of rig ${rigId} yet`);
    return controller;
  }

  drivenBy(server: BuiltServer | null): void {
    this.server = server;
  }

  /** While the database is away the engine waits for it on this very clock, so time must go on without its being idle. */
  async withoutDatabase(work: () => Promise<void>): Promise<void> {
    this.databaseAway = true;
    await work().finally(() => {
      this.databaseAway = false;
    });
  }

  private async settle(): Promise<void> {
    if (this.server !== null && !this.databaseAway) return this.server.services.idle();
    for (let turn = 0; turn < 20; turn += 1) await new Promise<void>((resolve) => void setImmediate(resolve));
  }
}

/** The whole server in this process: the demo lab and a foreign one on a real database, on a clock that moves when told. */
export class LabServer {
  private readonly cookies = new Map<string, string>();

  private constructor(
    readonly built: BuiltServer,
    readonly world: World,
    readonly database: TestDatabase,
  ) {}

  static async start(database: TestDatabase, options: LabServerOptions & { world?: World } = {}): Promise<LabServer> {
    const world = options.world ?? new World();
    await seedDemo(database.connection, {
      nowUtcMs: world.clock.utcMs(),
      hashPassword: async () => 'no password in this test',
      sha256,
      link: 'simulated',
    });
    const built = buildServer({
      database: database.connection,
      clock: world.clock,
      config: testConfig(database, options.config),
      overrides: {
        tasks: heavyTasks,
        controllerOf: world.controllerOf,
        ...{ journals: world.journals, standing: world.standing },
        ...{ ticks: false, paceMs: 30_000, objects: new MemoryObjects() },
        ...options.overrides,
      },
    });
    world.drivenBy(built);
    const server = new LabServer(built, world, database);
    await server.begin();
    return server;
  }

  get services(): BuiltServer['services'] {
    return this.built.services;
  }

  get clock(): VirtualClock {
    return this.world.clock;
  }

  private async begin(): Promise<void> {
    await this.built.start();
    await this.clock.advance(5_000);
    for (const { id } of demoPeople) await this.signIn(id);
  }

  async stop(): Promise<void> {
    await this.built.stop();
    this.world.drivenBy(null);
  }

  advance(ms: number, until?: () => boolean): Promise<void> {
    return this.clock.advance(ms, until);
  }

  station(rigId: string = demoIds.rig): RigStation {
    const station = this.services.stations.get(rigId);
    if (station === null) throw new Error('the rig has no open line');
    return station;
  }

  /** Gives an account a session; the demo's people have one from the start. */
  async signIn(userId: string): Promise<void> {
    const { token } = await this.services.sessions.create(userId, { userAgent: 'test', ip: '127.0.0.1' });
    this.cookies.set(userId, `ef=${token}`);
  }

  /** The cookie of the demo's member with this role, or of an account that signed in. */
  cookie(who: Role | { userId: string }): string {
    const userId = typeof who === 'string' ? (demoPeople.find(({ role }) => role === who)?.id ?? '') : who.userId;
    return this.cookies.get(userId) ?? '';
  }

  /** A request as a browser of that member would send it, with a fresh key for commands. */
  as(who: Role | { userId: string }, method: string, path: string): request.Test {
    const verb = method.toLowerCase() as 'get' | 'post' | 'put' | 'patch' | 'delete';
    return request(this.built.app)
      [verb](`/api${path}`)
      .set('Cookie', this.cookie(who))
      .set('Sec-Fetch-Site', 'same-origin')
      .set('Idempotency-Key', randomUUID());
  }

  /** Makes a protocol and issues its first revision on the demo rig. Returns its id. */
  async issue(document: ProtocolDocument): Promise<string> {
    const made = await this.as('operator', 'POST', `/labs/${demoIds.lab}/protocols`).send({ document }).expect(201);
    await this.as('operator', 'POST', `/labs/${demoIds.lab}/protocols/${made.body.id}/revisions`)
      .set('If-Match', made.headers.etag as string)
      .send({ rigId: demoIds.rig })
      .expect(201);
    return made.body.id as string;
  }

  /** Asks to start the first revision of a protocol on the demo rig. */
  askStart(protocolId: string, change: object = {}): request.Test {
    const fresh = { tappedAt: this.nowIso(), reviewToken: this.startToken(protocolId) };
    const body = { rigId: demoIds.rig, protocolId, revision: 1, massSetId: demoIds.massSet, ...fresh, ...change };
    return this.as('operator', 'POST', `/labs/${demoIds.lab}/runs`).send(body);
  }

  /** Arms the rig and starts a run of a new protocol. Returns the id of the run. */
  async run(document: ProtocolDocument): Promise<string> {
    const protocolId = await this.issue(document);
    await this.arm();
    const answer = await this.askStart(protocolId).expect(201);
    return answer.body.id as string;
  }

  async view(runId: string): Promise<RunView> {
    return (await this.as('viewer', 'GET', `/labs/${demoIds.lab}/runs/${runId}`).expect(200)).body as RunView;
  }

  /** Lets time pass until the engine shows the run in one of these states; one that is over is not waited for. */
  async until(runId: string, ...states: RunState[]): Promise<RunView> {
    const there = () => states.includes(this.services.supervisor.driverOf(runId)?.facts().state ?? (states[0] as RunState));
    await this.advance(3_600_000, there);
    const view = await this.view(runId);
    if (!states.includes(view.state)) throw new Error(`the run is ${view.state}: ${view.reason}`);
    return view;
  }

  /** Holds, resumes or stops a run as a member; `tappedAt` in ISO 8601. */
  intervene(
    runId: string,
    what: 'hold' | 'hold-after-dwell' | 'resume' | 'stop',
    by: { who?: Role; tappedAt?: string } = {},
  ): request.Test {
    const { who = 'operator', ...rest } = by;
    const reviewed = { userId: userIdOf(who), rigId: demoIds.rig, subject: resumeSubject(runId) };
    const fresh = { tappedAt: this.nowIso(), reviewToken: this.services.reviews.issue(reviewed).token };
    const body = what === 'resume' ? { ...fresh, ...rest } : rest;
    return this.as(who, 'POST', `/labs/${demoIds.lab}/runs/${runId}/${what}`).send(body);
  }

  /** What the operator's review of a start of the first revision gives. */
  startToken(protocolId: string): string {
    const subject = startSubject({ protocolId, revision: 1, massSetId: demoIds.massSet });
    return this.services.reviews.issue({ userId: userIdOf('operator'), rigId: demoIds.rig, subject }).token;
  }

  nowIso(): string {
    return new Date(this.clock.utcMs()).toISOString();
  }

  /** Signs the cautions of a rig as everybody who may set it in motion. */
  async sign(rigId: string = demoIds.rig): Promise<void> {
    for (const who of ['owner', 'keeper', 'operator'] as const)
      await this.as(who, 'POST', `/labs/${demoIds.lab}/rigs/${rigId}/cautions`).send({ version: cautionsVersion }).expect(201);
  }

  /** Asks as the operator to arm the demo rig until `hours` from now; the key is not turned yet. */
  askArm(hours = 16, rigId: string = demoIds.rig): request.Test {
    const until = new Date(this.clock.utcMs() + hours * 3_600_000).toISOString();
    return this.as('operator', 'POST', `/labs/${demoIds.lab}/rigs/${rigId}/arm`).send({ name: 'Ilse Marrowby', until });
  }

  /** Turns the arm key off and on, as somebody at the rig does. */
  async turnKey(rigId: string = demoIds.rig): Promise<void> {
    for (const on of [false, true]) {
      this.world.controller(rigId).turnArmKey(on);
      await this.advance(200);
    }
  }

  /** Arms the demo rig until `hours` from now: cautions, key, exit delay, closed door. */
  async arm(hours = 16, rigId: string = demoIds.rig): Promise<void> {
    await this.sign(rigId);
    await this.askArm(hours, rigId).expect(202);
    await this.turnKey(rigId);
    const { arms } = this.services;
    await this.advance(121_000, () => arms.armOf(rigId) !== null);
    for (let turns = 0; turns < 20 && arms.armOf(rigId) === null; turns += 1) await this.advance(10);
    // On a whole second: what a test writes in whole milliseconds is then exactly at the start of its run.
    await this.advance(1000 - (this.clock.utcMs() % 1000));
    if (arms.armOf(rigId) === null) throw new Error(`the rig is not armed: ${arms.endedOf(rigId)?.why ?? 'it says nothing'}`);
  }
}

const userIdOf = (role: Role): string => demoPeople.find((one) => one.role === role)?.id ?? '';
/** Home, then near and far for half a minute each: over in a few minutes. */
export const quickProtocol = (change: Partial<ProtocolDocument> = {}): ProtocolDocument => ({
  formatVersion: 1,
  name: 'There and back',
  steps: [
    { kind: 'home' },
    { kind: 'swing', to: 'near' },
    { kind: 'dwell', for_s: 30 },
    { kind: 'swing', to: 'far' },
    { kind: 'dwell', for_s: 30 },
  ],
  ...change,
});
