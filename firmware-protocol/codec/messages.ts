/** The typed messages of the line protocol; clause numbers are those of SPEC.md. */

/** Longest line, line feed included (SPEC 1.2). */
export const MAX_LINE_BYTES = 96;
export const PROTOCOL_VERSION = { major: 1, minor: 0 } as const;
/** SPEC 2.4. */
export const GREATEST_POSITION = 9_999_999;
export const GREATEST_RATE = 99_999_999;
/** SPEC 3.2: no session. */
export const NO_SESSION = '00000000';
/** SPEC 10.1. */
export const LEASE_MS = 2000;
/** SPEC 8.2. */
export const FURTHEST_BEGIN_MS = 60_000;
/** SPEC 11.6. */
export const WARNING_MS = 10_000;
/** SPEC 7.3 and 7.4. */
export const EVENT_RING = 32;
export const EVENTS_AT_ONCE = 8;

/** What a request asks for (SPEC 4). Positions in microsteps, speed and acceleration in thousandths of a microstep per s and s². */
export type Order =
  | { word: 'ident' }
  | { word: 'hello'; major: number; minor: number }
  | { word: 'status' }
  | { word: 'renew' }
  | { word: 'limits' }
  | { word: 'events'; from: number }
  | { word: 'home'; tag: string }
  | MoveOrder
  /** `steps` from where the table stands (SPEC 8.9). */
  | { word: 'nudge'; tag: string; steps: number }
  | TeachOrder
  | { word: 'hold' }
  | { word: 'stop'; drivers: 'keep' | 'free' }
  | { word: 'off' };

export interface MoveOrder {
  word: 'move';
  tag: string;
  position: number;
  speed: number;
  acceleration: number;
  /** Controller time of the first step, microseconds since its start; null: now. */
  beginUs: number | null;
}

/** Limits that replace those of SPEC 5.6 for good (8.10). */
export interface TeachOrder extends Limits {
  word: 'teach';
}

/** SPEC 5.6: soft travel limits as positions, caps and home speed in thousandths of a microstep per s and s². */
export interface Limits {
  least: number;
  greatest: number;
  speed: number;
  acceleration: number;
  home: number;
}

/** SPEC 8.11: of a controller that was never taught. */
export const UNTAUGHT_LIMITS: Limits = { least: -3600, greatest: 3600, speed: 200_000, acceleration: 200_000, home: 100_000 };

/** SPEC 8.9: the longest nudge, a 36th of the soft travel, rounded up, microsteps. */
export function longestNudge({ least, greatest }: Limits): number {
  return Math.ceil((greatest - least) / 36);
}

export interface Request {
  kind: 'request';
  epoch: number;
  session: string;
  number: number;
  order: Order;
}

/** A request with a right frame whose order cannot be understood: it is refused by its code (SPEC 4.1). */
export interface UnusableRequest {
  kind: 'unusable';
  epoch: number;
  session: string;
  number: number;
  code: 'word' | 'field';
}

export const STATES = ['rest', 'waiting', 'moving', 'homing', 'braking', 'fault'] as const;
export type MachineState = (typeof STATES)[number];

/** SPEC 5.4. */
export const FLAG = {
  positionKnown: 0x001,
  interlockClosed: 0x002,
  supplyPresent: 0x004,
  armKey: 0x008,
  driversOn: 0x010,
  homeFlag: 0x020,
  leaseLive: 0x040,
  motionEnded: 0x080,
  warningDue: 0x100,
} as const;

/** SPEC 5.5. */
export const CAPABILITY = { homeFlag: 0x0001, interlock: 0x0002, supply: 0x0004, armKey: 0x0008, warning: 0x0010, teach: 0x0020 } as const;

export interface OkBody {
  word: 'ok';
  state: MachineState;
  /** Counted microsteps from home; null while the position is unknown. */
  position: number | null;
  flags: number;
  event: number;
  dropped: number;
}

export interface HiBody {
  word: 'hi';
  major: number;
  minor: number;
  boot: string;
  session: string;
  resolutionUs: number;
  capabilities: number;
  firmware: string;
}

export interface LimitsBody extends Limits {
  word: 'lim';
}

export interface NoBody {
  word: 'no';
  /** One of `REFUSALS`, or a code of a later minor version (SPEC 12.1). */
  code: string;
  detail: number;
}

export type ReplyBody = OkBody | HiBody | LimitsBody | NoBody;

export interface Reply {
  kind: 'reply';
  session: string;
  number: number;
  /** T2: controller time of the request's line feed, microseconds. */
  receivedUs: number;
  /** T3 − T2, microseconds. */
  turnUs: number;
  body: ReplyBody;
}

export const BOOT_CAUSES = ['power', 'button', 'brownout', 'watchdog'] as const;
export type BootCause = (typeof BOOT_CAUSES)[number];
export const END_CAUSES = ['done', 'hold', 'stop', 'off', 'interlock', 'supply', 'lease', 'limit', 'session', 'search', 'fault'] as const;
export type EndCause = (typeof END_CAUSES)[number];

export type Happening =
  | { word: 'boot'; cause: BootCause }
  | { word: 'warn'; tag: string }
  | { word: 'began'; tag: string; position: number | null }
  | { word: 'ended'; tag: string; position: number | null; cause: EndCause }
  | { word: 'homed'; tag: string; position: number | null }
  | { word: 'edge'; position: number | null; direction: 'ccw' | 'cw' }
  | { word: 'interlock'; closed: boolean }
  | { word: 'supply'; present: boolean }
  | { word: 'key'; on: boolean }
  | { word: 'lease'; position: number | null }
  | { word: 'limit'; position: number | null }
  /** A kind of a later minor version (SPEC 7.6). */
  | { word: 'other'; name: string };

export interface EventMessage {
  kind: 'event';
  number: number;
  atUs: number;
  what: Happening;
}

export type Message = Request | Reply | EventMessage;

export type GarbageReason =
  /** longer than 96 bytes */
  | 'length'
  /** a byte outside the alphabet */
  | 'alphabet'
  /** no check word at the end, or another one than the bytes give */
  | 'check'
  /** right bytes, but no message of this protocol */
  | 'grammar';

/** A line that is dropped and counted, never obeyed (SPEC 1.6). */
export interface Garbage {
  kind: 'garbage';
  reason: GarbageReason;
  line: string;
}

/** An empty line: ignored, not counted (SPEC 1.5). */
export interface Blank {
  kind: 'blank';
}

export type Item = Request | UnusableRequest | Reply | EventMessage | Garbage | Blank;
