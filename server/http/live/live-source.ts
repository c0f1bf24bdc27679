import { findRun, readEvents, readSteps } from '@/server/store/runs-read';
import { isoOrNull } from '../maker';
import { storedRunView } from '../run-view';
import type { SignedIn } from '../route-context';
import type { Services } from '../services';
import type { LiveSource } from './live-hub';

/** Where the live streams take what they send: from the engine's memory while it drives the run, else from the database. */
export function liveSourceOf(services: () => Services): LiveSource {
  return {
    view: async ({ labId, runId }) => {
      const active = services().activeRuns.view(labId, runId);
      if (active !== null) return active;
      const run = await findRun(services().database.db, labId, runId);
      return run === null ? null : storedRunView(services(), run);
    },
    events: ({ labId, runId }, page) => readEvents(services().database.db, { labId, runId }, page),
    steps: ({ labId, runId }, seqs) => readSteps(services().database.db, { labId, runId }, seqs),
    beat: ({ rigId }) => {
      const link = services().stations.get(rigId)?.link;
      const health = link?.health();
      return {
        link: health?.condition ?? 'closed',
        lastReplyAt: isoOrNull(health?.lastReplyUtcMs ?? null),
        angleDeg: link?.controller()?.angleDeg ?? null,
        lockedBy: services().locks.lockedBy(rigId),
      };
    },
    mayStillRead: (reader, labId) => mayStillRead(services(), reader, labId),
  };
}

/** Whether whoever opened a stream still has a session and is still a member. */
export async function mayStillRead({ access }: Services, reader: SignedIn, labId: string): Promise<boolean> {
  const me = await access.signedIn(reader.token);
  return me !== null && (await access.membership(me.userId, labId)) !== null;
}
