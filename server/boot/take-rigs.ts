import type { Services } from '../http/services';
import type { StationRig } from '../interfaces/rig-stations';
import { recallSamples } from '../ingest/recall-samples';
import type { RecentSamples } from '../ingest/recent-samples';
import { isPassing } from '../store/failures';
import { findRig } from '../store/rigs';
import { unfinishedRuns } from '../store/runs-read';
import type { RigSide } from './build-rigs';
import type { RigKey } from './lease-keeper';

const AGAIN_MS = 1_000;

/** How a process comes to drive rigs: at its start those that nobody drives, later those whose driver is gone. */
export class RigTaking {
  /** One rig after the other: each reads the unfinished runs. */
  private last: Promise<unknown> = Promise.resolve();

  constructor(
    private readonly services: Services,
    private readonly side: Pick<RigSide, 'leases' | 'arms' | 'locks' | 'stations'> & { recent: RecentSamples },
  ) {}

  /** Those that another process drives are waited for, and keep none of the others waiting. */
  takeAll(rigs: readonly StationRig[]): Promise<void> {
    return this.inTurn(() => this.take(rigs));
  }

  /** The lease of a rig that was waited for is this process's now. A database that goes away meanwhile is asked again: nobody else would take it up. */
  takenOver({ labId, rigId }: RigKey): Promise<void> {
    const { services, side } = this;
    return this.inTurn(async () => {
      if (!side.leases.holds(rigId)) return;
      try {
        const rig = await findRig(services.database.db, labId, rigId);
        if (rig !== null) await this.take([rig]);
      } catch (error) {
        services.clock.after(AGAIN_MS, () => services.background(this.takenOver({ labId, rigId }), 'taking a rig over'));
        throw error;
      }
    });
  }

  private async take(rigs: readonly StationRig[]): Promise<void> {
    const { services, side } = this;
    for (const rig of rigs) await this.open(rig);
    const ids = new Set(rigs.map(({ id }) => id));
    const isOurs = (rigId: string) => ids.has(rigId) && side.leases.holds(rigId);
    for (const run of await unfinishedRuns(services.database.db)) {
      if (!isOurs(run.rigId)) continue;
      services.activeRuns.add(run);
      services.stations.loadMasses(run.rigId, run.start.rig);
      await recallSamples({ ...services, recent: side.recent }, { labId: run.labId, rigId: run.rigId, nowUtcMs: services.clock.utcMs() });
    }
    await services.access.refresh(services.watchedLabs());
    await services.supervisor.recover(isOurs);
  }

  /** A rig whose line cannot be opened keeps none of the others waiting; a run of it is blocked, with that reason. */
  private async open(rig: StationRig): Promise<void> {
    const { leases, arms, locks, stations } = this.side;
    const key = { labId: rig.labId, rigId: rig.id };
    try {
      if ((await leases.epochOf(key)) === null) return;
      await arms.load(key);
      await locks.load(key);
      // Whoever was stopped between the two: no arm stands where hands are in the rig.
      for (const { userId, name } of locks.locksOf(rig.id).slice(0, 1)) arms.end(key, `${name} set a personal lock`, { id: userId, name });
      await stations.put(rig);
    } catch (error) {
      if (isPassing(error)) throw error;
      this.services.log.error({ err: error, rigId: rig.id }, 'the line of the rig could not be opened');
    }
  }

  private inTurn(deed: () => Promise<void>): Promise<void> {
    const turn = this.last.then(deed, deed);
    this.last = turn.catch(() => undefined);
    return turn;
  }
}
