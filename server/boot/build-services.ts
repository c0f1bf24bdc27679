import { randomBytes, randomUUID } from 'node:crypto';
import { join } from 'node:path';
import { pino, type Logger } from 'pino';
import { createSessions } from '../auth/sessions';
import { RigSupervisor } from '../engine/rig-supervisor';
import { sha256Hex } from '../evaluation/sha256';
import { AccessDirectory } from '../http/access-directory';
import { ActiveRuns } from '../http/active-runs';
import { LiveHub } from '../http/live/live-hub';
import { liveSourceOf } from '../http/live/live-source';
import type { Services } from '../http/services';
import { workEvaluation } from '../http/work/evaluation-job';
import { rehearsalJobKind, workRehearsal } from '../http/work/rehearsal-job';
import type { Clock } from '../interfaces/clock';
import type { HeavyTasks } from '../interfaces/heavy-tasks';
import type { MailPort } from '../interfaces/mail';
import type { RigStation, StationRig } from '../interfaces/rig-stations';
import type { ServerConfig } from '../interfaces/server-config';
import type { LinkEvent } from '../interfaces/turntable-link';
import type { SimulatedController } from '../links/simulated-controller';
import { mailJobs } from '../notify/mail-jobs';
import type { Connection } from '../store/database';
import { evaluationJobKind } from '../store/evaluations';
import { createIdempotency } from '../store/idempotency';
import { createJobQueue } from '../store/jobs';
import { accessSource } from '../store/people';
import { createRunStore } from '../store/run-store';
import { createSampleStore } from '../store/sample-store';
import { ApparatusMemory } from './apparatus-memory';
import { MemoryArmKeeper } from './arm-keeper';
import { Background } from './background';
import { JobCrew } from './job-crew';
import { LeaseKeeper } from './lease-keeper';
import { ServerRigStations } from './rig-stations';
import { SimulatedApparatus } from './simulated-apparatus';
import { createWorkerTasks } from './worker-tasks';

export interface BuildParts {
  database: Connection;
  clock: Clock;
  config: ServerConfig;
  overrides?: BuildOverrides;
}

export interface BuildOverrides {
  mail?: MailPort;
  log?: Logger;
  /** Heavy work without worker threads. */
  tasks?: HeavyTasks;
  /** A simulated controller that outlives this server, as a real one does. */
  controllerOf?: (rig: StationRig) => SimulatedController;
  /** How often jobs are looked for and samples are stored, ms; default once a second. Tests on a clock of their own save the database work. */
  paceMs?: number;
  /** Whether chores run at their UTC times; they follow the machine's clock, whatever `clock` is. */
  ticks?: boolean;
}

/** What begins and ends with the server and no route needs. */
export interface Inside {
  leases: LeaseKeeper;
  arms: MemoryArmKeeper;
  stations: ServerRigStations;
  crew: JobCrew;
  background: Background;
  /** Unfinished runs are driven from now on. */
  tellTakenUp(): void;
  closeTasks(): Promise<void>;
}

const engineItself = { id: null, name: 'the run engine' };

const noMail: MailPort = { send: () => Promise.reject(new Error('no mail server is configured: set EVENFALL_SMTP_URL')) };

/** Wires the parts of the server to each other. */
export function buildServices({ database, clock, config, overrides = {} }: BuildParts): { services: Services; inside: Inside } {
  const log = overrides.log ?? createLog(config);
  const background = new Background(log);
  const newToken = () => randomBytes(32).toString('base64url');
  const nowUtcMs = () => clock.utcMs();
  const samples = createSampleStore(database);
  const sessions = createSessions({ db: database.db, clock, newToken, sha256: sha256Hex });
  const arms = new MemoryArmKeeper({ database, clock, log, sha256: sha256Hex, background: (work, what) => background.add(work, what) });
  const leases: LeaseKeeper = new LeaseKeeper({ database, clock, log, holder: randomUUID(), leaseMs: Math.max(5_000, overrides.paceMs ?? 0), onLost: () => letGo() });
  const stations: ServerRigStations = new ServerRigStations({
    database, samples, clock, log, paceMs: overrides.paceMs ?? 0, epochOf: (rig) => leases.epochOf(rig), apparatusOf: apparatusMaker({ clock, config, overrides }), onLinkEvent: (station, event) => heedLink(station, event),
  });
  const supervisor = new RigSupervisor({
    store: createRunStore(database.db), clock, sha256: sha256Hex,
    linkOf: (rigId) => stations.get(rigId)?.link ?? null,
    armOf: (rigId) => arms.armOf(rigId),
    perform: (effect, start) => {
      if (effect.kind === 'void-arm') arms.end({ labId: start.labId, rigId: start.rigId }, effect.reason, engineItself);
      else log.info({ runId: start.runId, topic: effect.topic }, effect.text);
    },
  });
  const live = new LiveHub({ source: liveSourceOf(() => services), clock, streamsPerUser: config.limits.streamsPerUser });
  const access = new AccessDirectory({ source: accessSource(database.db, nowUtcMs), sessions, clock, sha256: sha256Hex });
  const workers = overrides.tasks === undefined ? createWorkerTasks() : null;
  let tellTakenUp: () => void = () => undefined;
  const services: Services = {
    config: { ...config, limits: { ...config.limits } }, clock, log, database, sessions, access, samples, stations, arms, supervisor, live,
    newId: randomUUID, newToken, sha256: sha256Hex,
    idempotency: createIdempotency(database.db, nowUtcMs),
    mail: overrides.mail ?? noMail,
    activeRuns: new ActiveRuns({ supervisor, live }),
    tasks: overrides.tasks ?? (workers as HeavyTasks),
    background: (work, what) => background.add(work, what),
    takenUp: new Promise((resolve) => {
      tellTakenUp = resolve;
    }),
    breathe: () => new Promise((resolve) => setImmediate(resolve)),
    pokeJobs: () => crew.poke(),
  };
  const crew = new JobCrew({
    clock, log, pollMs: overrides.paceMs ?? 1000,
    queueFor: (name) => createJobQueue(database.db, `${name} of process ${String(process.pid)}`, nowUtcMs),
    crews: {
      work: { [evaluationJobKind]: (job) => workEvaluation(services, job), [rehearsalJobKind]: (job) => workRehearsal(services, job) },
      mail: mailJobs({ db: database.db, clock, mail: services.mail, newToken, sha256: sha256Hex }),
    },
  });
  access.onEnded((ended) => live.endAccess(ended));
  stations.onSamples(({ rigId, channelId, channel, unit, utcMs, value }) => live.sampled(rigId, { channelId, channel, unit, utcMs: [...utcMs], value: [...value] }));

  /** Two drivers on one rig would be worse than none. */
  function letGo(): void {
    log.fatal('another server has taken a rig over; this one lets go of all of them');
    supervisor.close();
    background.add(stations.close(), 'closing the lines');
  }

  /** Whatever lets people or surprises into the room ends the arm, run or no run. */
  function heedLink(station: RigStation, event: LinkEvent): void {
    const why = endOfArm(event);
    if (why !== null) arms.end(station, why, engineItself);
  }

  return { services, inside: { leases, arms, stations, crew, background, tellTakenUp: () => tellTakenUp(), closeTasks: async () => workers?.close() } };
}

function endOfArm(event: LinkEvent): string | null {
  if (event.kind === 'interlock' && !event.closed) return 'the interlock was opened';
  if (event.kind === 'supply' && !event.present) return 'the motor supply was lost';
  if (event.kind === 'reset') return 'the controller restarted';
  if (event.kind === 'ready' && !event.controller.interlockClosed) return 'the interlock is open';
  if (event.kind === 'ready' && !event.controller.supplyPresent) return 'the motor supply is off';
  return null;
}

/** Logs as JSON lines on stderr; what could let somebody in or name a person is taken out, wherever it stands. */
function createLog(config: ServerConfig): Logger {
  const secret = ['password', 'token', 'cookie', 'authorization', 'email', 'passwordHash'];
  return pino({ level: config.mode === 'test' ? 'silent' : config.logLevel, base: undefined, timestamp: pino.stdTimeFunctions.isoTime, redact: secret.flatMap((key) => [key, `*.${key}`, `*.*.${key}`, `*.*.*.${key}`]) }, pino.destination(2));
}

/** The simulated turntable of a rig: one for the life of this server, or one that is handed in and lives longer. */
function apparatusMaker({ clock, config, overrides }: { clock: Clock; config: ServerConfig; overrides: BuildOverrides }): (rig: StationRig) => SimulatedApparatus {
  const memory = config.mode === 'test' ? null : new ApparatusMemory(join(config.stateDir, 'simulated'));
  const made = new Map<string, { key: string; apparatus: SimulatedApparatus }>();
  return (rig) => {
    const { motion } = rig.document;
    if (motion === undefined) throw new Error('a simulated rig needs motion data');
    const key = JSON.stringify(rig.document);
    const known = made.get(rig.id);
    if (known?.key === key) return known.apparatus;
    const controller = overrides.controllerOf?.(rig);
    const apparatus = new SimulatedApparatus({ clock, rigId: rig.id, document: { ...rig.document, motion }, seed: randomBytes(3).readUIntBE(0, 3), memory, ...(controller === undefined ? {} : { controller }) });
    made.set(rig.id, { key, apparatus });
    return apparatus;
  };
}
