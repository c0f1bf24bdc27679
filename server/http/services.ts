import type { Logger } from 'pino';
import type { Arming } from '../engine/arming';
import type { KeyTurns } from '../engine/key-turns';
import type { GuidedMoves } from '../engine/guided-moves';
import type { MotorSoak } from '../engine/motor-soak';
import type { RigSupervisor } from '../engine/rig-supervisor';
import type { ArmKeeper } from '../interfaces/arm-keeper';
import type { CameraPort } from '../interfaces/camera';
import type { Clock } from '../interfaces/clock';
import type { HeavyTasks } from '../interfaces/heavy-tasks';
import type { IdempotencyPort } from '../interfaces/idempotency';
import type { LockKeeper } from '../interfaces/lock-keeper';
import type { MailPort } from '../interfaces/mail';
import type { ObjectStore } from '../interfaces/object-store';
import type { OutgoingPort } from '../interfaces/outgoing';
import type { LiveChange, ProcessPost } from '../interfaces/process-post';
import type { PushPort } from '../interfaces/push';
import type { TellParts } from '../notify/tell';
import type { SecretBox } from '../interfaces/secret-box';
import type { RigStations } from '../interfaces/rig-stations';
import type { AppendRates } from '../ingest/append-rate';
import type { ChannelFacts } from '../ingest/recent-samples';
import type { SampleBatch, SampleStore } from '../interfaces/sample-store';
import type { ServerConfig } from '../interfaces/server-config';
import type { SessionPort } from '../interfaces/sessions';
import type { KnownHead } from '../store/audit-chain';
import type { Connection } from '../store/database';
import type { AccessDirectory } from './access-directory';
import type { ActiveRuns } from './active-runs';
import type { RigDesk } from './desk/rig-desk';
import type { RigOutlook } from './desk/rig-outlook';
import type { LineHub } from './live/line-hub';
import type { LiveHub } from './live/live-hub';
import type { AnswerCounts } from './metrics';
import type { Reviews } from './reviews';
import type { StartSeeds } from './start-seeds';

/** Everything a route may use; built once by `server/boot/build-server.ts`. */
export interface Services {
  config: ServerConfig;
  clock: Clock;
  log: Logger;
  answers: AnswerCounts;
  /** A fresh random id (UUID). */
  newId(): string;
  /** A fresh secret of 256 bits for links in mails, base64url. */
  newToken(): string;
  /** SHA-256 of UTF-8 text, hex. */
  sha256(text: string): string;
  database: Connection;
  sessions: SessionPort;
  access: AccessDirectory;
  idempotency: IdempotencyPort;
  /** For passwords that the server gives to others. */
  secrets: SecretBox;
  mail: MailPort;
  push: PushPort;
  outgoing: OutgoingPort;
  cameras: CameraPort;
  /** How people are told, by every means. */
  tell: TellParts;
  samples: SampleStore;
  /** Files that people brought in. */
  objects: ObjectStore;
  /** How much each device may still append. */
  appendRates: AppendRates;
  /** Samples of a rig that have just come: for those who watch, and for the conditions of its run. */
  arrived(rigId: string, channel: ChannelFacts & { channelId: string }, batch: SampleBatch): void;
  stations: RigStations;
  arms: ArmKeeper;
  arming: Arming;
  keyTurns: KeyTurns;
  locks: LockKeeper;
  supervisor: RigSupervisor;
  guided: GuidedMoves;
  soak: MotorSoak;
  activeRuns: ActiveRuns;
  /** Where is asked what only the process can answer that drives the rig. */
  desk: RigDesk;
  /** What the live streams tell of rigs. */
  outlook: RigOutlook;
  /** The other processes of this database; null where one plays all roles. */
  post: ProcessPost | null;
  /** A run changed: all who follow it are told, in this process and in others. */
  runChanged(runId: string, change: LiveChange): void;
  reviews: Reviews;
  startSeeds: StartSeeds;
  live: LiveHub;
  lines: LineHub;
  tasks: HeavyTasks;
  /** Labs whose rigs this process drives: their members must be able to hold, stop and lock without the database. */
  watchedLabs(): string[];
  /** Lets something go on after the answer; a failure is logged, and `idle` waits for it. */
  background(work: Promise<unknown>, what: string): void;
  /** Resolves when this server has taken up the runs that another left unfinished. */
  takenUp: Promise<void>;
  /** Since when the database does not answer, as far as the keeper of the rig leases has noticed; null while it does. */
  databaseAwaySinceUtcMs(): number | null;
  /** Bytes free for this server on the disk of its state folder; null: the system does not tell. */
  freeBytes(): Promise<number | null>;
  /** Where the audit chains ended on earlier days, as written down beside the database. */
  knownAuditHeads(): Promise<KnownHead[]>;
  /** Lets everything else have a turn: long work calls it between its parts, so that hold and stop never wait for it. */
  breathe(): Promise<void>;
  /** Tells the workers that a job was queued, so that it need not wait for their next look. */
  pokeJobs(): void;
}
