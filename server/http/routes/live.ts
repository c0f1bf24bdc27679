import * as contracts from '@/shared/contracts/runs';
import { findRun } from '@/server/store/runs-read';
import { notFound } from '../problem-error';
import { mount } from '../route-context';

/** Sequence number of a Last-Event-ID, or null where there is none or it is not one of ours. */
const lastEventIdOf = (header: string | undefined): number | null =>
  header !== undefined && /^\d{1,9}$/.test(header) ? Number(header) : null;

export const liveRoutes = [
  mount(contracts.liveRun, async ({ params, membership, me, services, req, res }) => {
    const run =
      services.activeRuns.find(membership.labId, params.runId)?.run ??
      (await findRun(services.database.db, membership.labId, params.runId));
    if (run === null) throw notFound('run');
    // Where nobody drives its rig the page is told so, and shows what is stored.
    if (run.endedAt === null && !run.rehearsal) await services.outlook.follow(run).catch(() => undefined);
    await services.live.open(res, {
      run: { labId: run.labId, runId: run.id, rigId: run.rigId },
      me,
      lastEventId: lastEventIdOf(req.get('last-event-id')),
    });
    return undefined;
  }),
];
