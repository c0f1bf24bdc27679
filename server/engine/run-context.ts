import type { DwellFacts } from '@/shared/conditions/dwell-verdict';
import type { WaitFinding } from '@/shared/conditions/wait-condition';
import type { Otherwise } from '@/shared/protocol/wait';
import type { Finding, Look } from './look';
import type { CursorState, PlannedItem } from '@/shared/protocol/cursor';
import type { StepRow } from '@/shared/archive/run-records';
import type { PositionProof } from '@/shared/rig/position-proof';
import type { ControllerState, LinkCommand, LinkEvent } from '../interfaces/turntable-link';
import type { Instant } from '../interfaces/clock';
import type { OpenPair } from './pairs';

/**
 * What a run remembers between two events, what it may be told and what it asks for. All of it is plain data: the
 * context is stored as JSON after every transition and is everything a restarted server has to go on.
 */

/**
 * Raised whenever the shape or meaning of the stored context changes; `stored-snapshot.ts` brings older ones up to it, and versions that
 * it does not know are quarantined.
 */
export const CHART_VERSION = 7;

export type ChartState =
  | 'starting'
  | 'choosing'
  | 'homing'
  | 'moving'
  | 'standing'
  | 'awaiting'
  | 'interrupted'
  | 'holding'
  | 'held'
  | 'stopping'
  | 'stopped'
  | 'finished'
  | 'failed';

export interface Arm {
  /** The person on site who answers for the rig. */
  name: string;
  untilUtcMs: number;
}

/** A motion that was asked of the controller. */
export interface Motion {
  commandId: string;
  /** Absolute turntable angle, deg; null while homing. */
  targetDeg: number | null;
  /** When the controller was asked to begin; null: at once. */
  startUtcMs: number | null;
  /** How long the profile takes, ms. */
  durationMs: number;
  /** It comes after its time: after a hold or an interruption, or begun late. */
  late: boolean;
  /** The controller said so. */
  began: boolean;
  /** It ended where it was sent to, by the controller's own word. */
  reached: boolean;
}

/** The step that is being executed, or that a hold has left unfinished. */
export interface ActiveStep {
  item: PlannedItem;
  row: StepRow;
  /** Length first planned, ms; null where the step ends by an event. */
  plannedMs: number | null;
  motion: Motion | null;
  /** The row was closed before the step was done (hold, interruption); resuming begins it anew or finishes the move. */
  broken: boolean;
  /** It ends by a condition or a person, not by a plan. */
  awaits?: boolean;
  /** The sources stand between two moves of a shaped swing or a kick: such a pause has no row in the log; `row` only tells of it. */
  pause?: boolean;
}

/** What a step that ends by a condition or a person waits for. */
export interface Waiting {
  sinceUtcMs: number;
  /** Before that no samples can tell. */
  firstLookUtcMs: number;
  /** Null: never. */
  givesUpUtcMs: number | null;
  otherwise: Otherwise;
  /** As last looked at; null before, and for a prompt. */
  found: WaitFinding | null;
}

/** A move that was sent to the controller while the dwell before it still lasts. */
export interface MoveAhead {
  commandId: string;
  targetDeg: number;
  startUtcMs: number;
  /** Cancelled by `hold after this dwell`: should it have begun all the same, the run holds. */
  cancelled: boolean;
}

export type InterruptionCause = 'link-lost' | 'server-restarted' | 'lease-lapsed' | 'database-away';

export interface Interruption {
  cause: InterruptionCause;
  /** The last instant at which all was known to be well. */
  sinceUtcMs: number;
}

/** The run ends early, on a whole pair: because somebody asked for it, the night window ends, or few dwells are good. */
export interface Finishing {
  /** Who asked; empty: the night window of the room where there is a `finishByUtcMs`, else the few good dwells. */
  by: string;
  askedUtcMs: number;
  /** The run is to be over by then; null: with the pair under way. */
  finishByUtcMs: number | null;
  /** Who took it back: the run goes on to the end of its protocol, and nothing asks again by itself; null: nobody. */
  withdrawnBy: string | null;
}

export type InterventionKind = 'hold' | 'hold-after-dwell' | 'hold-withdrawn' | 'resume' | 'skip' | 'stop';

export interface Intervention {
  kind: InterventionKind;
  by: string;
  serverAtUtcMs: number;
  /** When the controller itself said that the turntable stands still; null until then. */
  confirmedAtUtcMs: number | null;
  /** Command whose standstill confirms it. */
  commandId: string | null;
}

/** Why a run is held or failed, in words for people, with a code for programs. */
export interface Reason {
  code: string;
  text: string;
}

/** What the engine last heard of the controller. */
export interface KnownController {
  bootId: string;
  positionKnown: boolean;
  angleDeg: number | null;
  moving: boolean;
  interlockClosed: boolean;
  supplyPresent: boolean;
  /** As in `ControllerState`: it tells of an interlock that was opened and closed again while nobody listened. */
  warningDue?: boolean;
}

/** What the run knows of how well its counted angles are proved. */
export interface KnownPosition {
  proof: PositionProof;
  /** Dwells since the last good pass of the home edge: to be marked if the next one tells of a slip. */
  dwells: StepRow[];
  /** Counts at the passes of the edge in the homing that goes on: the last one in ccw tells how far the count had gone wrong. */
  homingOffDeg: number | null;
}

export interface RunContext {
  cursor: CursorState;
  rowCount: number;
  commandCount: number;
  dwellsDone: number;
  /** Of these, the good ones. */
  dwellsGood: number;
  /** Of these, good by themselves, but the other of their pair was skipped; absent: none. */
  dwellsUnpaired?: number;
  /** What was measured in the dwells that were judged, the last ones: near minus far so far comes from them. */
  dwells: DwellFacts[];
  /** Sequence number of the dwell that is being judged, or was last. */
  judging: number | null;
  /** The dwell that ended last was not good, and no repeat was told of it yet. */
  dwellJustNotGood: boolean;
  waiting: Waiting | null;
  startedAtUtcMs: number | null;
  endedAtUtcMs: number | null;
  arm: Arm | null;
  /** Why the arm no longer holds; null while it does. */
  armVoid: string | null;
  controller: KnownController | null;
  position: KnownPosition;
  linkUp: boolean;
  /** Since when the link is down; null while it is up. */
  linkDownSinceUtcMs: number | null;
  /** Since when the database is away, as far as it counts (longer than its grace); null while it answers. */
  databaseAwaySinceUtcMs: number | null;
  /** Standard uncertainty of instants taken from the plan, s: that of the last controller stamp. */
  uPlanS: number;
  step: ActiveStep | null;
  ahead: MoveAhead | null;
  /** How often the controller refused or cancelled the move now due. */
  moveRetries: number;
  /** Where and when the step before the present one ended: the start of the next. */
  moment: Instant & { angleDeg: number };
  /** Name of the station to which the sources were brought last: two stations may share an angle. */
  station?: string;
  /** The present step began at the planned end of a dwell, settle or wait: a swing now is timed, and `late` if it begins later. */
  onCadence: boolean;
  /** Start of the swing before, from which a beat is counted; null when no swing came before or it was broken. */
  swingStartUtcMs: number | null;
  /** Where a plain swing began that was made in its time and that the present dwell directly follows; null where there is none. */
  swungFromDeg: number | null;
  /** The dwell for which the run was held by itself last: those up to it ask for no hold any more. */
  heldForDwell: number | null;
  /** Shuffled passes whose order the log has told last; absent: none. */
  ordersTold?: string[];
  /** The pair that the dwells so far have left open. */
  pair: OpenPair;
  /** That it ends before the end of its protocol; absent: nobody ever asked. */
  finishing?: Finishing;
  /** Set by `hold after this dwell`. */
  holdAfterStep: string | null;
  /** Keys of the last holds and stops: a repeat that comes late, to another process too, is no second one. Absent: none. */
  actedOn?: string[];
  intervention: Intervention | null;
  interruption: Interruption | null;
  /** When the hold or stop that is being carried out came. */
  haltedAtUtcMs: number | null;
  reason: Reason | null;
  /** UTC ms at which the driver is to send `deadline`; null: nothing is awaited by time. */
  deadlineUtcMs: number | null;
  /** Set while the chart chooses what comes next. */
  next: 'homing' | 'moving' | 'standing' | 'awaiting' | 'holding' | 'stopping' | 'finished' | 'failed' | null;
}

/** Stored form of a run between two events. */
export interface RunSnapshot {
  version: number;
  state: ChartState;
  context: RunContext;
}

type Told<T extends string, P = unknown> = { type: T; /** the server's clock when it took the event up */ at: Instant } & P;

type LinkEventOf<K extends LinkEvent['kind']> = Extract<LinkEvent, { kind: K }>;
export type LinkTold = { [K in LinkEvent['kind']]: Told<`link.${K}`, { link: LinkEventOf<K> }> }[LinkEvent['kind']];

export type RunEvent =
  | LinkTold
  | Told<'begin', { controller: ControllerState | null }>
  | Told<'deadline'>
  /** `acted`: id of the command that already went to the controller; `key`: the same for each repeat of one request. */
  | Told<'hold', { by: string; acted: string | null; key?: string | null }>
  | Told<'stop', { by: string; acted: string | null; key?: string | null }>
  | Told<'hold-after-dwell', { by: string; key?: string | null }>
  | Told<'withdraw-hold', { by: string }>
  /** To end on a whole pair; `by` empty: for the night window, which ends at `finishByUtcMs`, or for the few good dwells. */
  | Told<'finish-early', { by: string; finishByUtcMs: number | null }>
  | Told<'withdraw-finish', { by: string }>
  | Told<'resume', { by: string; arm: Arm | null }>
  /** Leaves out the rest of the step whose row this is. */
  | Told<'skip', { by: string; arm: Arm | null; seq: number }>
  /** The arm of the rig was ended before its time, by a person or by what happened at the rig. */
  | Told<'arm-ended', { why: string }>
  /** Another process, or the same anew, has taken the run up. */
  | Told<'server-restarted', { aliveUtcMs: number; serverName?: string | null }>
  /** `acted`: id of a hold that already went to the controller; null where nothing could move. */
  | Told<'database-away', { sinceUtcMs: number; acted: string | null }>
  /** It answers again, and holds all that was kept elsewhere meanwhile. */
  | Told<'database-back'>
  /** What the samples say to a look. */
  | Told<'looked', { finding: Finding | null }>
  /** A person has done what the prompt asks for; `arm`: of the rig, which was armed again at the rig. */
  | Told<'confirm-prompt', { by: string; arm: Arm | null }>;

export type RunEventType = RunEvent['type'];
export type RunEventOf<T extends RunEventType> = Extract<RunEvent, { type: T }>;

export type NoticeTopic = 'started' | 'held' | 'resumed' | 'stopped' | 'failed' | 'finished' | 'prompted' | 'proved';

/** What is to be done after the transition is saved; every effect has an id that makes a repeat harmless. */
export type Effect =
  | { kind: 'link'; id: string; command: LinkCommand }
  | { kind: 'void-arm'; id: string; reason: string }
  | { kind: 'notify'; id: string; topic: NoticeTopic; text: string }
  /** The driver looks into the samples and answers with `looked`. */
  | { kind: 'look'; id: string; look: Look };

/** An event of the chain before it is chained. */
export interface Happening {
  at: Instant;
  kind: string;
  data: Record<string, unknown>;
}

export interface Advance {
  snapshot: RunSnapshot;
  /** Rows that are new or changed, whole. */
  steps: StepRow[];
  events: Happening[];
  effects: Effect[];
}
