import * as contracts from '@/shared/contracts/exclusions';
import type { ExclusionView } from '@/shared/contracts/exclusions';
import * as store from '@/server/store/exclusions';
import type { RunRecord } from '@/server/store/runs-read';
import { audited } from '../audited';
import { isoOf } from '../maker';
import { notFound, ProblemError } from '../problem-error';
import { mount } from '../route-context';
import { loadRun } from '../run-view';

const viewOf = (row: store.ExclusionRecord): ExclusionView => ({
  id: row.id,
  runId: row.runId,
  startUtcMs: row.startUtcMs,
  endUtcMs: row.endUtcMs,
  made: { at: isoOf(row.madeAt), by: row.madeBy, reason: row.reason },
  withdrawn: row.withdrawnAt === null ? null : { at: isoOf(row.withdrawnAt), by: row.withdrawnBy ?? '', reason: row.withdrawnReason ?? '' },
});

/** How far a stretch may reach beyond the run: both ends of a run are known to better than that. */
const slackMs = 1000;

interface Stretch {
  startUtcMs: number;
  endUtcMs: number;
}

function assertWithin(run: RunRecord, stretch: Stretch, nowUtcMs: number): void {
  if (run.startedAt === null) throw new ProblemError('not-possible-now', 'The run has not begun: there is nothing to exclude yet.');
  if (stretch.endUtcMs <= stretch.startUtcMs)
    throw new ProblemError('invalid-input', 'The stretch ends before it begins.', [{ path: 'endUtcMs', message: 'after startUtcMs' }]);
  const until = run.endedAt ?? nowUtcMs;
  const path = stretch.startUtcMs < run.startedAt - slackMs ? 'startUtcMs' : stretch.endUtcMs > until + slackMs ? 'endUtcMs' : null;
  if (path === null) return;
  const within = `from ${isoOf(run.startedAt)} to ${isoOf(until)}`;
  throw new ProblemError('invalid-input', `The stretch reaches beyond the run, which goes ${within}.`, [{ path, message: within }]);
}

function assertNew(inForce: readonly store.ExclusionRecord[], stretch: Stretch): void {
  const covers = inForce.find((one) => one.startUtcMs <= stretch.startUtcMs && one.endUtcMs >= stretch.endUtcMs);
  if (covers !== undefined)
    throw new ProblemError('already-exists', `${covers.madeBy} excluded all of this stretch already: ${covers.reason}`);
  if (inForce.length >= contracts.mostExclusions)
    throw new ProblemError(
      'not-possible-now',
      `${String(contracts.mostExclusions)} stretches of this run are excluded. Withdraw some, and exclude longer ones instead.`,
    );
}

export const exclusionRoutes = [
  mount(contracts.listExclusions, async ({ params, membership, services }) => {
    const run = await loadRun(services, membership.labId, params.runId);
    return { items: (await store.exclusionsOf(services.database.db, { labId: run.labId, runId: run.id })).map(viewOf) };
  }),

  mount(contracts.makeExclusion, async (context) => {
    const { params, body, me, membership, services } = context;
    const run = await loadRun(services, membership.labId, params.runId);
    const madeAt = services.clock.utcMs();
    assertWithin(run, body, madeAt);
    const ofRun = { labId: run.labId, runId: run.id };
    const data = ({ id }: store.ExclusionRecord) => ({
      runId: run.id,
      exclusionId: id,
      from: isoOf(body.startUtcMs),
      until: isoOf(body.endUtcMs),
      reason: body.reason,
    });
    const made = await audited(context, { kind: 'run.data-excluded', data }, async (tx) => {
      assertNew(
        (await store.exclusionsOf(tx, ofRun)).filter(({ withdrawnAt }) => withdrawnAt === null),
        body,
      );
      return store.insertExclusion(tx, { ...ofRun, ...body, madeAt, madeBy: me.name });
    });
    return viewOf(made);
  }),

  mount(contracts.withdrawExclusion, async (context) => {
    const { params, body, me, membership, services } = context;
    const { labId } = membership;
    const { exclusionId } = params;
    const withdrawal = { labId, exclusionId, at: services.clock.utcMs(), by: me.name, reason: body.reason };
    const data = ({ runId }: store.ExclusionRecord) => ({ runId, exclusionId, reason: body.reason });
    const row = await audited(context, { kind: 'run.exclusion-withdrawn', data }, async (tx) => {
      const done = await store.withdrawExclusion(tx, withdrawal);
      if (done !== null) return done;
      const known = await store.findExclusion(tx, labId, exclusionId);
      if (known === null) throw notFound('exclusion');
      throw new ProblemError('not-possible-now', `${known.withdrawnBy ?? 'Somebody'} withdrew this exclusion already.`);
    });
    return viewOf(row);
  }),
];
