import type { Instant } from './clock';

/** What the run engine may ask of the turntable and what it is told: the whole vocabulary between engine and link. */

export type LinkCondition =
  /** not opened, or closed on purpose */
  | 'closed'
  /** opening the port or waiting for the reply to hello */
  | 'opening'
  /** hello answered; a valid reply within the last 5 s */
  | 'ready'
  /** no valid reply for 5 s, or the port is gone; reconnecting by itself */
  | 'lost'
  /** the other end is not a controller this version can drive (other major version, another device) */
  | 'refused';

export interface ControllerState {
  bootId: string;
  firmware: string;
  positionKnown: boolean;
  /** Counted angle, deg; null while the position is unknown. */
  angleDeg: number | null;
  moving: boolean;
  interlockClosed: boolean;
  supplyPresent: boolean;
  armKey: boolean;
  driversOn: boolean;
  /** The home flag covers its sensor: the table stands clockwise of the edge. */
  homeFlagCovered: boolean;
  /** The motion lease is live. */
  leaseLive: boolean;
  /** A warning comes before the next motion: the controller has just started, or the interlock was opened since the last one. */
  warningDue: boolean;
}

export type LinkCommand =
  | { kind: 'home'; id: string }
  | {
      kind: 'move';
      id: string;
      /** Absolute turntable angle, deg. */
      targetDeg: number;
      speedDegS: number;
      accelerationDegS2: number;
      /** When the motion is to begin; null: at once. */
      startUtcMs: number | null;
    }
  /** A small turn by `turnDeg` (positive: counter-clockwise) from where the table stands, for a person at the rig: the arm key must be on. */
  | { kind: 'nudge'; id: string; turnDeg: number }
  /** Decelerate, keep torque, cancel a waiting move. */
  | { kind: 'hold'; id: string }
  /** Decelerate and end the session's motion; drivers released only where the rig is marked safe when free. */
  | { kind: 'stop'; id: string; releaseDrivers: boolean };

/** A motion that was sent and whose end was not told yet. */
export type MotionSent = Pick<Extract<LinkCommand, { kind: 'home' | 'move' }>, 'kind' | 'id'>;

/** Soft travel limits, caps and home speed as the controller itself keeps them. */
export interface ControllerLimits {
  leastDeg: number;
  greatestDeg: number;
  maxSpeedDegS: number;
  maxAccelerationDegS2: number;
  homeSpeedDegS: number;
}

/** What became of limits that the controller was to be taught. */
export type TeachOutcome =
  | { taught: true; /** as the controller has them now, rounded to its microsteps */ limits: ControllerLimits }
  | { taught: false; code: string; message: string };

export type MotionEndCause = 'done' | 'hold' | 'stop' | 'interlock' | 'supply' | 'lease' | 'limit' | 'reset';

/** An interlock that was opened, a supply that was lost or an arm key that was turned off while no server listened, UTC ms. */
export interface UnheardOpening {
  input: 'interlock' | 'supply' | 'arm-key';
  utcMs: number;
}

export type LinkEvent =
  | {
      kind: 'ready';
      at: Instant;
      controller: ControllerState;
      /** same boot id as before the line was lost */
      sameBoot: boolean;
      /** The last that this start of the controller remembers of before anybody here listened; null: it remembers none. */
      unheard: UnheardOpening | null;
    }
  | { kind: 'lost'; at: Instant; why: string }
  | { kind: 'refused-controller'; at: Instant; why: string }
  | { kind: 'accepted'; at: Instant; commandId: string }
  | { kind: 'refused'; at: Instant; commandId: string; code: string; message: string }
  /** Motion of `commandId` began at the controller's own stamp. */
  | { kind: 'motion-began'; at: Instant; commandId: string; angleDeg: number | null }
  /** Motion ended; `angleDeg` is the achieved angle (null: position lost). A cancelled waiting move ends without having begun. */
  | { kind: 'motion-ended'; at: Instant; commandId: string; angleDeg: number | null; cause: MotionEndCause }
  | { kind: 'homed'; at: Instant; commandId: string; angleDeg: number }
  | { kind: 'home-failed'; at: Instant; commandId: string; message: string }
  /** The controller itself says that the turntable stands still after hold or stop `commandId`. */
  | { kind: 'standstill'; at: Instant; commandId: string; angleDeg: number | null }
  /** The home flag changed its level; `angleDeg` is what was counted there (null: position unknown). */
  | { kind: 'edge'; at: Instant; angleDeg: number | null; direction: 'ccw' | 'cw' }
  | { kind: 'interlock'; at: Instant; closed: boolean }
  | { kind: 'supply'; at: Instant; present: boolean }
  | { kind: 'arm-key'; at: Instant; on: boolean }
  /** The controller restarted: position is lost, whatever was running is over. */
  | { kind: 'reset'; at: Instant; bootId: string }
  /** The motion lease lapsed in the controller. */
  | { kind: 'lease-lapsed'; at: Instant }
  /** One of the clocks jumped: the host's wall clock against its monotonic one, or the controller's against the host's. */
  | { kind: 'clock-stepped'; at: Instant; clock: 'host' | 'controller'; byMs: number };

export interface LinkHealth {
  condition: LinkCondition;
  /** Words for people: what is awaited, or why it is refused. */
  detail: string;
  lastReplyUtcMs: number | null;
  roundTripMs: number | null;
  /** Of the last 100 answers; null before the first. */
  roundTripP50Ms: number | null;
  roundTripP95Ms: number | null;
  /** Lines that came in and were no message, and their bytes. */
  discardedLines: number;
  discardedBytes: number;
  /** Lines that the controller dropped since it started, modulo 65536; null before it told. */
  droppedByController: number | null;
  /** Requests that were written again because no answer came. */
  retries: number;
  reconnects: number;
  clockOffsetMs: number | null;
  /** Standard uncertainty of the offset, s. */
  clockUS: number | null;
  /** How much faster the controller's clock runs, parts per million, with its standard uncertainty; null before there is a line to fit. */
  driftPpm: number | null;
  driftUPpm: number | null;
  bootId: string | null;
  firmware: string | null;
  /** Version of the line protocol that the controller speaks. */
  protocol: string | null;
  /** Epoch of another driver that the controller has met and that keeps this one out; null: none does. */
  higherEpoch: number | null;
}

export interface TurntableLink {
  open(): void;
  close(): Promise<void>;
  health(): LinkHealth;
  controller(): ControllerState | null;
  /** As the controller last told them; null before its first greeting. */
  limits(): ControllerLimits | null;
  /** Replaces the controller's limits for good. It must be at rest and its arm key on: a person is at the rig. Never rejects. */
  teach(limits: ControllerLimits): Promise<TeachOutcome>;
  /** Sends a command at most once; the outcome comes as events. Hold and stop are repeated until confirmed. */
  send(command: LinkCommand): void;
  /**
   * Motions that another process sent and that this one answers for now. What the controller still keeps of them is read again and told under
   * their ids, with its own stamps; only then is `ready` told, once more where it was told before. Nothing is sent a second time.
   */
  takeUp(motions: readonly MotionSent[]): void;
  /** Greets the controller under a higher epoch from now on: one that another driver's epoch keeps from this one listens again. */
  raiseEpoch(epoch: number): void;
  /** Asked before each heartbeat: may the motion lease be renewed? Answered by the run loop itself. */
  setLeaseRule(mayRenew: () => boolean): void;
  subscribe(listener: (event: LinkEvent) => void): () => void;
}
