import type { RunView } from '@/shared/contracts/runs';
import type { LineMessage } from '@/shared/contracts/link';
import { HOST_STEP_MS, wallUtcMs } from '@/server/interfaces/clock';
import type { RigPlace, RigTold } from '@/server/interfaces/process-post';
import { findRun } from '@/server/store/runs-read';
import { isoOrNull } from '../maker';
import { lineOf } from '../line-view';
import { storedRunView } from '../run-view';
import type { Services } from '../services';

/** What the live streams tell of a rig, from wherever it is driven. */
export interface RigOutlook {
  /**
   * Before a page begins to follow a rig.
   * @throws ProblemError `rigs-away` where no process tells anything of it
   */
  follow(rig: RigPlace): Promise<void>;
  /** The line of a rig as it is now; null where it has none, or nobody tells of it any more. */
  line(rig: RigPlace): LineMessage | null;
  beat(rig: RigPlace): RigTold['beat'];
  /** A run as whoever drives it sees it, else as the database holds it; null where there is none. */
  view(run: { labId: string; runId: string; rigId: string }): Promise<RunView | null>;
}

/** Out of the memory of this process. */
export class HereOutlook implements RigOutlook {
  constructor(private readonly services: () => Services) {}

  follow(): Promise<void> {
    return Promise.resolve();
  }

  line(rig: RigPlace): LineMessage | null {
    return lineOf(this.services(), rig);
  }

  beat({ rigId }: RigPlace): RigTold['beat'] {
    const { stations, locks, supervisor } = this.services();
    const link = stations.get(rigId)?.link;
    const health = link?.health();
    const clock = supervisor.activeOf(rigId)?.parts.clock;
    const runAheadMs = clock === undefined ? 0 : Math.round(clock.utcMs() - wallUtcMs(clock));
    return {
      ...(Math.abs(runAheadMs) < HOST_STEP_MS ? {} : { runAheadMs }),
      link: health?.condition ?? 'closed',
      lastReplyAt: isoOrNull(health?.lastReplyUtcMs ?? null),
      angleDeg: link?.controller()?.angleDeg ?? null,
      lockedBy: locks.lockedBy(rigId),
    };
  }

  async view({ labId, runId }: { labId: string; runId: string }): Promise<RunView | null> {
    const services = this.services();
    const active = services.activeRuns.view(labId, runId);
    if (active !== null) return active;
    const run = await findRun(services.database.db, labId, runId);
    return run === null ? null : storedRunView(services, run);
  }
}
