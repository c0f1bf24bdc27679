import { readEvents, readSteps } from '@/server/store/runs-read';
import type { SignedIn } from '../route-context';
import type { Services } from '../services';
import type { LiveSource } from './live-hub';

/** Where the live streams take what they send: from whoever drives the rig, else from the database. */
export function liveSourceOf(services: () => Services): LiveSource {
  return {
    view: (run) => services().outlook.view(run),
    events: ({ labId, runId }, page) => readEvents(services().database.db, { labId, runId }, page),
    steps: ({ labId, runId }, seqs) => readSteps(services().database.db, { labId, runId }, seqs),
    beat: (run) => services().outlook.beat(run),
    mayStillRead: (reader, labId) => mayStillRead(services(), reader, labId),
  };
}

/** Whether whoever opened a stream still has a session and is still a member. */
export async function mayStillRead({ access }: Services, reader: SignedIn, labId: string): Promise<boolean> {
  const me = await access.signedIn(reader.token);
  return me !== null && (await access.membership(me.userId, labId)) !== null;
}
