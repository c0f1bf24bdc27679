import type { Logger } from 'pino';
import type { Clock } from '../interfaces/clock';
import type { HeavyTasks } from '../interfaces/heavy-tasks';
import type { RunJournals } from '../interfaces/run-journal';
import type { StandingJournal } from '../interfaces/standing-journal';
import type { MailPort } from '../interfaces/mail';
import type { ObjectStore } from '../interfaces/object-store';
import type { OutgoingPort } from '../interfaces/outgoing';
import type { ProcessPost } from '../interfaces/process-post';
import type { PushPort } from '../interfaces/push';
import type { StationRig } from '../interfaces/rig-stations';
import type { ServerConfig } from '../interfaces/server-config';
import type { SimulatedController } from '../links/simulated-controller';
import type { Connection } from '../store/database';

export interface BuildParts {
  database: Connection;
  /** Connections of the engine's own, so that no crowd of pages stands before a step, a lease or an arm; default `database`. */
  engineDatabase?: Connection;
  clock: Clock;
  config: ServerConfig;
  overrides?: BuildOverrides;
}

export interface BuildOverrides {
  mail?: MailPort;
  push?: PushPort;
  outgoing?: OutgoingPort;
  /** Where files are kept; default: as the configuration says. */
  objects?: ObjectStore;
  log?: Logger;
  /** Heavy work without worker threads. */
  tasks?: HeavyTasks;
  /** A simulated controller that outlives this server, as a real one does. */
  controllerOf?: (rig: StationRig) => SimulatedController;
  /** How often jobs are looked for and samples are stored, ms; default once a second. Tests on a clock of their own save the database work. */
  paceMs?: number;
  /** Exit delay of a rig with a real line, ms; for tests in real time. */
  exitDelayMs?: number;
  /** Where runs write while the database is away; default: files of the state folder. */
  journals?: RunJournals;
  standing?: StandingJournal;
  /** Free disk, bytes. */
  freeBytes?: () => Promise<number | null>;
  /** The post of a process that does not play all roles; default: through the database. */
  post?: ProcessPost;
  /** Whether chores run at their UTC times; they follow the machine's clock, whatever `clock` is. */
  ticks?: boolean;
}
