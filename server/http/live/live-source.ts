import { findRun, readEvents, readSteps } from '@/server/store/runs-read';
import { isoOrNull } from '../maker';
import { storedRunView } from '../run-view';
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
      };
    },
    mayStillRead: async (reader, labId) => {
      const me = await services().access.signedIn(reader.token);
      return me !== null && (await services().access.membership(me.userId, labId)) !== null;
    },
  };
}
