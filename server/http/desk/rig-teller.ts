import type { Clock } from '@/server/interfaces/clock';
import type { ArrivedSamples, LiveChange, ProcessMessage, ProcessPost, RigPlace } from '@/server/interfaces/process-post';
import { Repeated } from './repeated';
import type { RigOutlook } from './rig-outlook';

const beatMs = 500;
/** Pages that do not ask again for so long follow no more, ms. */
const followedMs = 12_000;

export interface TellerParts {
  post: ProcessPost;
  clock: Clock;
  outlook: RigOutlook;
  drives(rigId: string): boolean;
  onError(error: unknown): void;
}

/** Tells other processes of the rigs that this one drives: runs whenever they change, lines and samples while somebody follows them. */
export class RigTeller {
  private readonly followed = new Map<string, RigPlace & { untilMs: number }>();
  private readonly samples = new Map<string, ArrivedSamples[]>();
  private readonly beats: Repeated;

  constructor(private readonly parts: TellerParts) {
    this.beats = new Repeated(parts.clock, beatMs, () => this.beat());
    parts.post.onMessage((message) => this.hear(message));
  }

  runChanged(runId: string, change: LiveChange): void {
    this.tell({ kind: 'run', runId, change });
  }

  /** Something happened on a rig. */
  rigChanged(rigId: string): void {
    const rig = this.followed.get(rigId);
    if (rig !== undefined) this.tellOf(rig);
  }

  /** Samples of a rig's own balance: kept for the next beat. */
  sampled(arrived: ArrivedSamples): void {
    if (this.followed.has(arrived.rigId)) this.samples.set(arrived.rigId, [...(this.samples.get(arrived.rigId) ?? []), arrived]);
  }

  /** Samples of a device, which the conditions of a run may wait for in another process. */
  fromDevice(arrived: ArrivedSamples): void {
    this.tellBatch(arrived);
  }

  close(): void {
    this.beats.end();
  }

  private hear(message: ProcessMessage): void {
    if (message.kind !== 'follow') return;
    for (const { labId, rigId } of message.rigs) {
      if (!this.parts.drives(rigId)) continue;
      const isNew = !this.followed.has(rigId);
      const rig = { labId, rigId, untilMs: this.parts.clock.monotonicMs() + followedMs };
      this.followed.set(rigId, rig);
      if (isNew) this.tellOf(rig);
    }
    if (this.followed.size > 0) this.beats.keep();
  }

  /** Whether anybody follows still. */
  private beat(): boolean {
    for (const rig of [...this.followed.values()]) {
      if (rig.untilMs > this.parts.clock.monotonicMs() && this.parts.drives(rig.rigId)) this.tellOf(rig);
      else this.followed.delete(rig.rigId);
    }
    this.tellSamples();
    return this.followed.size > 0;
  }

  private tellOf({ labId, rigId }: RigPlace): void {
    const { outlook } = this.parts;
    this.tell({ kind: 'rig', labId, rigId, line: outlook.line({ labId, rigId }), beat: outlook.beat({ labId, rigId }) });
  }

  private tellSamples(): void {
    for (const batches of this.samples.values()) for (const batch of batches) this.tellBatch(batch);
    this.samples.clear();
  }

  private tellBatch({ utcMs, value, ...batch }: ArrivedSamples): void {
    this.tell({ kind: 'samples', ...batch, utcMs: Array.from(utcMs), value: Array.from(value) });
  }

  /** Whether anybody hears it is not waited for. */
  tell(message: ProcessMessage): void {
    this.parts.post.tell(message).catch((error: unknown) => this.parts.onError(error));
  }
}
