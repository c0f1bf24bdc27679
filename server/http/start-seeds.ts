import type { Clock } from '../interfaces/clock';

/** Longer than a review of a start lasts. */
const keptMs = 60_000;

/**
 * From what the next run of each rig draws the order of shuffled repeats: drawn when somebody looks at what a start would do, so that the run
 * that is begun then is the one that was looked at. In memory: after a restart everything is reviewed anew.
 */
export class StartSeeds {
  private readonly byRig = new Map<string, { seed: number; untilMs: number }>();

  constructor(private readonly parts: { clock: Clock; newId(): string }) {}

  /** 32 random bits: the same until a run has begun with them, or nobody has asked for them for a minute. */
  of(rigId: string): number {
    const nowMs = this.parts.clock.monotonicMs();
    const kept = this.byRig.get(rigId);
    const seed = kept === undefined || kept.untilMs < nowMs ? Number.parseInt(this.parts.newId().slice(0, 8), 16) : kept.seed;
    this.byRig.set(rigId, { seed, untilMs: nowMs + keptMs });
    return seed;
  }

  /** A run has begun with it: the next one draws anew. */
  used(rigId: string): void {
    this.byRig.delete(rigId);
  }
}
