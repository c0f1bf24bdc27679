import type { StepRow, ChainedEvent } from '@/shared/archive/run-records';
import type { LineMessage } from '@/shared/contracts/link';
import type { ProblemCode } from '@/shared/contracts/problem';
import type { Role } from '@/shared/contracts/roles';
import type { LiveMessages } from '@/shared/contracts/runs';

/** What the processes of one database say to each other. Each has one post; what nobody hears is lost. */

export interface RigPlace {
  labId: string;
  rigId: string;
}

/** What somebody asks of a rig: a request of the API, past its edge. */
export interface RigQuestion {
  /** Name of the contract. */
  route: string;
  params: Record<string, string>;
  query: unknown;
  body: unknown;
  ifMatch: string | null;
  /** The request's `Idempotency-Key`, where it has one. */
  key?: string | null;
  me: { userId: string; name: string; email: string } | null;
  membership: { labId: string; labName: string; timeZone: string; role: Role } | null;
}

export type RigReply =
  | { kind: 'answer'; status: number; body: unknown; etag: string | null }
  | {
      kind: 'problem';
      code: ProblemCode;
      detail: string;
      errors: readonly { path: string; message: string; code?: string | undefined }[] | null;
      retryAfterS: number | null;
    };

/** Who is to answer: whoever drives this rig, this very process, or any that drives rigs. */
export type Addressee = { rigId: string } | { process: string } | 'any';

/** What a saved transition of a run changed, as its pages are told. */
export interface LiveChange {
  events: readonly ChainedEvent[];
  steps: readonly StepRow[];
  progress: LiveMessages['progress'];
}

/** What pages that follow a rig are told of it; `line` is null where the rig has none. */
export interface RigTold {
  line: LineMessage | null;
  beat: Omit<LiveMessages['beat'], 'serverAt'>;
}

/** Samples of a rig that have just come. */
export interface ArrivedSamples {
  rigId: string;
  channel: { channelId: string; name: string; unit: string; role: 'deflection' | 'environment' | 'turntable'; rateHz: number | null };
  utcMs: ArrayLike<number>;
  value: ArrayLike<number>;
}

export type ProcessMessage =
  /** A question lies in the database and is taken by one process at most. */
  | { kind: 'question'; labId: string; id: string; to: Addressee }
  /** A question that does no harm when it is heard late or twice: it does not wait for a table. */
  | { kind: 'urgent'; id: string; to: Addressee; question: RigQuestion }
  | { kind: 'answered'; labId: string; id: string }
  | { kind: 'urgent-answered'; id: string; reply: RigReply }
  /** Pages of the sender follow these rigs for the next seconds. */
  | { kind: 'follow'; rigs: readonly RigPlace[] }
  | ({ kind: 'rig' } & RigPlace & RigTold)
  | { kind: 'run'; runId: string; change: LiveChange }
  | ({ kind: 'samples' } & ArrivedSamples)
  | { kind: 'access-ended'; ended: { sessionId: string } | { userId: string } }
  | { kind: 'jobs' };

export interface ProcessPost {
  /** Name of this process, the same as on its leases. */
  readonly process: string;
  /** Begins to hear; resolves after the first attempt, and tries again whenever the line breaks. */
  open(): Promise<void>;
  close(): Promise<void>;
  /** Says something to all others, of any length; in order. Rejects where it cannot be said. */
  tell(message: ProcessMessage): Promise<void>;
  /** Whoever hears what others say; called in order. */
  onMessage(listener: (message: ProcessMessage) => void): void;
  /** What was said for a while was not heard: the line to the others was broken and stands again. */
  onGap(listener: () => void): void;
  /** Whether others are heard at the moment. */
  hears(): boolean;
  /** Lays a question down and says so. */
  ask(question: RigQuestion, key: { labId: string; id: string; to: Addressee }): Promise<void>;
  /** Takes a question that nobody has taken; null where somebody has, or it was withdrawn. */
  take(key: { labId: string; id: string }): Promise<RigQuestion | null>;
  /** Takes a question back that nobody has taken; false where somebody has. */
  withdraw(key: { labId: string; id: string }): Promise<boolean>;
  /** Answers a question that this process took, and says so. */
  reply(key: { labId: string; id: string }, reply: RigReply): Promise<void>;
  /** The answer, which is gone with that; null while there is none. */
  collect(key: { labId: string; id: string }): Promise<RigReply | null>;
  /** Which process drives which rig of a lab now. */
  driversIn(labId: string): Promise<{ rigId: string; process: string }[]>;
}
