import type { Sha256 } from '@/shared/archive/chain';
import type { ChainedEvent, RunStart, StepRow } from '@/shared/archive/run-records';
import type { Clock } from '../interfaces/clock';
import type { RunJournal } from '../interfaces/run-journal';
import type { RunStore, StoredRun } from '../interfaces/run-store';
import type { SampleReader } from '../interfaces/sample-reader';
import type { TurntableLink } from '../interfaces/turntable-link';
import type { Arm } from './run-context';
import type { RunFacts } from './run-facts';
import type { OwnEffect } from './stored-snapshot';

export interface RunDriverParts {
  start: RunStart;
  /** What the store holds of a run that is taken up again; null for a new one. */
  stored: StoredRun | null;
  store: RunStore;
  /** Takes what is written while the database is away. */
  journal: RunJournal;
  /** Opened and kept by its owner; the driver listens and sends. */
  link: TurntableLink;
  clock: Clock;
  /** What was measured lately on the rig; absent where nothing ever is. */
  samples?: SampleReader;
  sha256: Sha256;
  /** The arm of the rig now; null when nobody answers for it. */
  armNow(): Arm | null;
  /** Why nobody answers for it any more; a rehearsal has nobody, nor anybody's hands in it. */
  whyDisarmed?(): string;
  /** In a sentence, whose personal locks are on the rig; null while there are none. */
  lockedBy?(): string | null;
  /** Of this process, for the log of a run that it takes up. */
  serverName?: string;
  /** Notifications and the end of the arm, performed after they were saved. */
  perform(effect: OwnEffect): void;
  /** Whether a failed write may simply be tried again; a store in memory fails for good. */
  isPassing?(error: unknown): boolean;
  /** An error that is nobody's answer: of a listener, of `perform`, or one that made the driver let go of the run. */
  onError?(error: unknown): void;
  /** That error made the driver hold the turntable and let go of the run, which has not ended. */
  onBroken?(error: unknown): void;
  /** Another process has written on in the run's log: this driver has let go of it. */
  onTakenOver?(): void;
}

/** What one saved transition changed. */
export interface RunChange {
  facts: RunFacts;
  steps: StepRow[];
  events: ChainedEvent[];
}

export type Answer =
  | {
      ok: true;
      serverAtUtcMs: number;
      /** Of a hold or a stop: resolves when it is safe on a disk, so that no restart can forget it. */
      kept?: Promise<unknown>;
    }
  | { ok: false; why: string };

/** What answers on a line that is ready; null while it is not. */
export const readyController = (link: TurntableLink) => (link.health().condition === 'ready' ? link.controller() : null);
