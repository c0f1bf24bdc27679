import { randomBytes, randomUUID } from 'node:crypto';
import { createSessions } from '../auth/sessions';
import { sha256Hex } from '../evaluation/sha256';
import { AccessDirectory } from '../http/access-directory';
import { ActiveRuns } from '../http/active-runs';
import { LiveHub } from '../http/live/live-hub';
import { LineHub } from '../http/live/line-hub';
import { liveSourceOf, mayStillRead } from '../http/live/live-source';
import { lineOf } from '../http/line-view';
import { AnswerCounts } from '../http/metrics';
import { Reviews } from '../http/reviews';
import { StartSeeds } from '../http/start-seeds';
import { tellStored } from '../http/run-view';
import type { Services } from '../http/services';
import { AlarmWatch } from '../http/work/alarm-watch';
import { workEvaluation } from '../http/work/evaluation-job';
import { morningJobKind, workMorning } from '../http/work/morning-job';
import { rehearsalJobKind, workRehearsal } from '../http/work/rehearsal-job';
import { thinningJobKind, workThinning } from '../http/work/thinning-job';
import { tellStarter } from '../http/work/tell-starter';
import { AppendRates } from '../ingest/append-rate';
import { createCameraPort } from '../ingest/camera-fetch';
import { RecentSamples } from '../ingest/recent-samples';
import { MailNotSetUp, type MailPort } from '../interfaces/mail';
import type { ArrivedSamples } from '../interfaces/process-post';
import type { StationRig } from '../interfaces/rig-stations';
import type { ServerConfig } from '../interfaces/server-config';
import { alarmJobs } from '../notify/alarm-jobs';
import { mailJobs } from '../notify/mail-jobs';
import { createOutgoing } from '../notify/outgoing';
import { runNoticeJobs } from '../notify/run-notices';
import { createWebPush } from '../notify/web-push';
import { evaluationJobKind } from '../store/evaluations';
import { createIdempotency } from '../store/idempotency';
import { createJobQueue } from '../store/jobs';
import { accessSource } from '../store/people';
import { createSampleStore } from '../store/sample-store';
import { Background } from './background';
import { buildAcross, createPost, type Across } from './build-across';
import type { BuildParts } from './build-parts';
import { buildRigSide, type RigSide } from './build-rigs';
import { createLog } from './create-log';
import { knownHeads } from './audit-anchor';
import { DatabaseDisk } from './database-disk';
import { freeBytesAt, fullest } from './free-disk';
import { JobCrew } from './job-crew';
import { foldersOf, objectsOf } from './objects-of';
import { createSecretBox } from './secret-box';
import { RigTaking } from './take-rigs';
import { createWorkerTasks } from './worker-tasks';

/** What begins and ends with the server and no route needs. */
export interface Inside extends Omit<RigSide, 'supervisor' | 'guided' | 'soak' | 'keyTurns'> {
  crew: JobCrew;
  background: Background;
  watch: AlarmWatch;
  /** Drives these rigs, as far as nobody else does. */
  takeRigs(rigs: readonly StationRig[]): Promise<void>;
  /** Unfinished runs are driven from now on. */
  tellTakenUp(): void;
  closeTasks(): Promise<void>;
  across: Pick<Across, 'close'>;
  databaseDisk: DatabaseDisk;
}

const noMail: MailPort = { send: () => Promise.reject(new MailNotSetUp()) };
const newToken = () => randomBytes(32).toString('base64url');
const usualPollMs = 1000;

/** Wires the parts of the server to each other. */
export function buildServices(parts: BuildParts): { services: Services; inside: Inside } {
  const { database, clock, config, overrides = {} } = parts;
  const log = overrides.log ?? createLog(config);
  const background = new Background(log);
  let awaySinceUtcMs: number | null = null;
  const nowUtcMs = () => clock.utcMs();
  const [post, samples, recent] = [createPost(parts, log), createSampleStore(database), new RecentSamples()];
  const sessions = createSessions({ db: database.db, clock, newToken, sha256: sha256Hex });
  const { arms, arming, keyTurns, locks, leases, stations, supervisor, guided, apparatus, soak } = buildRigSide(parts, {
    ...{ holder: post?.process ?? randomUUID(), log, background, samples },
    samplesOf: (rigId) => recent.readerOf(rigId),
    onLine: (rigId) => (lines.changed(rigId), told.rigChanged(rigId)),
    onTaken: (rig) => background.add(taking.takenOver(rig), 'taking a rig over'),
    onDatabase: (sinceUtcMs) => watch.noteDatabase((awaySinceUtcMs = sinceUtcMs)),
    onQuarantine: ({ start }) => (services.activeRuns.remove(start.runId), tellStored(services, { labId: start.labId, id: start.runId })),
    onNotice: (start, notice) => tellStarter(services, start, notice),
    onLinkEvent: (station, event, wasArmed) => watch.heard(station, event, wasArmed),
  });
  const { live, lines } = buildHubs(parts, () => services);
  const { desk, outlook, told, ...across } = buildAcross(config, {
    ...{ post, clock, log, newId: randomUUID, services: () => services, side: { leases, arms, locks }, live },
    keep: keeping(config, recent, live),
    pokeJobs: () => crew.poke(),
  });
  const access = new AccessDirectory({ source: accessSource(database.db, nowUtcMs), sessions, clock, sha256: sha256Hex });
  const workers = overrides.tasks === undefined ? createWorkerTasks() : null;
  const takenUp = openPromise();
  const services: Services = {
    ...{ clock, log, database, sessions, access, samples, stations, live, lines, newToken },
    ...{ arms, arming, keyTurns, locks, supervisor, guided, soak },
    config: { ...config, limits: { ...config.limits }, devices: { ...config.devices } },
    ...{ newId: randomUUID, sha256: sha256Hex, desk, outlook, post, arrived: told.arrived, runChanged: told.runChanged },
    ...{ reviews: new Reviews({ clock, newToken }), startSeeds: new StartSeeds({ clock, newId: randomUUID }), answers: new AnswerCounts() },
    ...{ objects: overrides.objects ?? objectsOf(config), appendRates: new AppendRates(clock, () => services.config.devices) },
    ...{ idempotency: createIdempotency(database.db, nowUtcMs), secrets: createSecretBox(config) },
    ...buildTelling(parts, () => services.config.port),
    activeRuns: new ActiveRuns({ supervisor, onChange: told.runChanged }),
    watchedLabs: () => leases.labIds(),
    tasks: overrides.tasks ?? (workers as NonNullable<typeof workers>),
    background: (work, what) => background.add(work, what),
    takenUp: takenUp.promise,
    databaseAwaySinceUtcMs: () => awaySinceUtcMs,
    ...{ knownAuditHeads: () => knownHeads(config.stateDir), freeBytes: overrides.freeBytes ?? (() => freeBytesAt(config.stateDir)) },
    breathe: () => new Promise((resolve) => setImmediate(resolve)),
    pokeJobs: () => (crew.poke(), told.jobsQueued()),
  };
  const [databaseDisk, crew] = [new DatabaseDisk(config, { database, log }), buildCrew(parts, services)];
  const watch = new AlarmWatch({ services, paceMs: overrides.paceMs, freeDisk: () => fullest(foldersOf(config), databaseDisk) });
  const taking = new RigTaking(services, { leases, arms, locks, stations, recent });
  tellOn(services, stations, told);
  return {
    services,
    inside: {
      ...{ leases, arms, arming, locks, stations, apparatus, crew, background, watch, across, databaseDisk },
      takeRigs: (rigs) => taking.takeAll(rigs),
      tellTakenUp: takenUp.resolve,
      closeTasks: async () => workers?.close(),
    },
  };
}

/** What happens here is told to the streams of this process, and to others. */
function tellOn({ access, live, lines }: Services, stations: RigSide['stations'], told: Across['told']): void {
  access.onEnded((ended) => {
    live.endAccess(ended);
    lines.endAccess(ended);
    told.accessEnded(ended);
  });
  stations.onSamples(({ rigId, channel, utcMs, value, ...facts }) =>
    told.measured({ rigId, channel: { ...facts, name: channel, role: 'deflection' }, utcMs, value }),
  );
}

/** How people and watchers are reached. */
function buildTelling({ database: { db }, clock, config, overrides = {} }: BuildParts, port: () => number) {
  const nowUtcMs = () => clock.utcMs();
  const origin = () => config.publicUrl ?? `http://${config.host}:${String(port())}`;
  const mail = overrides.mail ?? noMail;
  const outgoing = overrides.outgoing ?? createOutgoing(config.privateHosts);
  const address = /<([^>]+)>/.exec(config.mailFrom)?.[1] ?? config.mailFrom;
  const subject = config.publicUrl?.startsWith('https:') === true ? config.publicUrl : `mailto:${address}`;
  const push = overrides.push ?? createWebPush({ db, outgoing, subject, nowUtcMs });
  const cameras = createCameraPort({ hosts: config.cameraHosts, nowUtcMs });
  return { mail, push, outgoing, cameras, tell: { db, clock, mail, push, origin } };
}

/** What follows runs and lines live. */
function buildHubs({ clock, config }: BuildParts, services: () => Services): Pick<Services, 'live' | 'lines'> {
  const { streamsPerUser } = config.limits;
  const live = new LiveHub({ source: liveSourceOf(services), clock, streamsPerUser });
  const lines = new LineHub({
    ...{ clock, streamsPerUser },
    lineOf: (rig) => lineOf(services(), rig),
    mayStillRead: (reader, labId) => mayStillRead(services(), reader, labId),
  });
  return { live, lines };
}

/** Where samples go that have just come, besides the database. */
function keeping({ roles }: ServerConfig, recent: RecentSamples, live: LiveHub): (samples: ArrivedSamples) => void {
  const forRuns = roles.includes('rig');
  return ({ rigId, channel: { channelId, name, unit, role, rateHz }, utcMs, value }) => {
    if (forRuns) recent.add(rigId, { name, unit, role, rateHz }, { utcMs: Float64Array.from(utcMs), value: Float64Array.from(value) });
    if (role === 'deflection') live.sampled(rigId, { channelId, channel: name, unit, utcMs: Array.from(utcMs), value: Array.from(value) });
  };
}

/** Workers of this process: mails do not wait behind a rehearsal. */
function buildCrew({ overrides = {} }: BuildParts, services: Services): JobCrew {
  const { clock, log, database, mail } = services;
  return new JobCrew({
    clock,
    log,
    pollMs: overrides.paceMs ?? usualPollMs,
    queueFor: (name) => createJobQueue(database.db, `${name} of process ${String(process.pid)}`, () => clock.utcMs()),
    crews: {
      work: {
        [evaluationJobKind]: (job) => workEvaluation(services, job),
        [rehearsalJobKind]: (job) => workRehearsal(services, job),
        [morningJobKind]: (job) => workMorning(services, job),
        [thinningJobKind]: (job) => workThinning(services, job),
      },
      mail: mailJobs({ db: database.db, clock, mail, newToken, sha256: sha256Hex }),
      calls: { ...alarmJobs(services.tell), ...runNoticeJobs(services.tell) },
    },
  });
}

function openPromise(): { promise: Promise<void>; resolve: () => void } {
  let resolve: () => void = () => undefined;
  const promise = new Promise<void>((done) => {
    resolve = done;
  });
  return { promise, resolve };
}
