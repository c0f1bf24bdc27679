import * as contracts from '@/shared/contracts/work';
import { givenUpJobs, retryGivenUpJob } from '@/server/store/jobs';
import { audited } from '../audited';
import { isoOf } from '../maker';
import { notFound } from '../problem-error';
import { mount } from '../route-context';

/** Given-up jobs of the lab. */
export const workRoutes = [
  mount(contracts.listGivenUpJobs, async ({ membership, services }) => ({
    items: (await givenUpJobs(services.database.db, membership.labId)).map((job) => ({
      ...{ id: job.id, kind: job.kind, attempts: job.attempts, lastError: job.lastError ?? '' },
      ...{ askedAt: isoOf(job.createdAt), givenUpAt: isoOf(job.finishedAt ?? job.createdAt) },
    })),
  })),

  mount(contracts.retryJob, async (context) => {
    const { params, membership, services } = context;
    const job = { labId: membership.labId, jobId: params.jobId };
    await audited(context, { kind: 'job.retried', data: () => ({ jobId: job.jobId }) }, async (tx) => {
      if (!(await retryGivenUpJob(tx, job, services.clock.utcMs()))) throw notFound('given-up job');
    });
    services.pokeJobs();
    return undefined;
  }),
];
