import { VirtualClock } from '@/server/engine/virtual-clock';
import { CutShort, type Job, type JobHandler, type JobQueue } from '@/server/interfaces/jobs';
import { startJobWorker } from '@/server/scheduler/job-worker';

const settle = () => new Promise<void>((resolve) => setImmediate(resolve));

/** A queue in memory that writes down what the worker does with it. */
function listQueue(kinds: string[]) {
  const done: string[] = [];
  const waiting = kinds.map((kind, index): Job => ({ id: String(index), labId: null, kind, payload: null, attempt: 1, maxAttempts: 3 }));
  const queue: JobQueue = {
    take: (wanted) => {
      const index = waiting.findIndex((job) => wanted.includes(job.kind));
      return Promise.resolve(index < 0 ? null : (waiting.splice(index, 1)[0] as Job));
    },
    renew: (job) => {
      done.push(`renew ${job.id}`);
      return Promise.resolve(true);
    },
    finish: (job) => {
      done.push(`finish ${job.id}`);
      return Promise.resolve();
    },
    fail: (job, why) => {
      done.push(`fail ${job.id}: ${why}`);
      return Promise.resolve();
    },
    giveBack: (job) => {
      done.push(`give back ${job.id}`);
      return Promise.resolve();
    },
  };
  return { queue, done, waiting };
}

function work(kinds: string[], handler: JobHandler) {
  const clock = new VirtualClock(0, settle);
  const list = listQueue(kinds);
  const problems: unknown[] = [];
  const worker = startJobWorker({ queue: list.queue, clock, handlers: { mail: handler }, onProblem: ({ error }) => problems.push(error) });
  return { clock, worker, problems, ...list };
}

test('jobs are worked off one after another without waiting between them', async () => {
  const { done, worker } = work(['mail', 'mail', 'mail'], () => Promise.resolve());
  await settle();
  expect(done).toEqual(['finish 0', 'finish 1', 'finish 2']);
  await worker.stop();
});

test('kinds without a handler are left in the queue', async () => {
  const { waiting, worker } = work(['evaluation'], () => Promise.resolve());
  await settle();
  expect(waiting).toHaveLength(1);
  await worker.stop();
});

test('a failed job is reported and put back, and the next is done', async () => {
  const { done, problems, worker } = work(['mail', 'mail'], (job) =>
    job.id === '0' ? Promise.reject(new Error('refused')) : Promise.resolve(),
  );
  await settle();
  expect(done).toEqual(['fail 0: refused', 'finish 1']);
  expect(problems).toHaveLength(1);
  await worker.stop();
});

test('a job that the end of the process cuts short is given back and has not failed', async () => {
  const { done, worker } = work(['mail'], () => Promise.reject(new CutShort()));
  await settle();
  expect(done).toEqual(['give back 0']);
  await worker.stop();
});

test('an idle worker looks again after a second, or when woken', async () => {
  const { clock, done, waiting, worker } = work([], () => Promise.resolve());
  const add = (id: string) => waiting.push({ id, labId: null, kind: 'mail', payload: null, attempt: 1, maxAttempts: 3 });
  await settle();
  add('later');
  await clock.advance(999);
  expect(done).toEqual([]);
  await clock.advance(1);
  expect(done).toEqual(['finish later']);
  add('woken');
  worker.wake();
  await settle();
  expect(done).toEqual(['finish later', 'finish woken']);
  await worker.stop();
});

test('the lease is renewed while a long job goes on, and not after', async () => {
  let end = (): void => undefined;
  const { clock, done, worker } = work(['mail'], () => new Promise<void>((resolve) => (end = resolve)));
  await clock.advance(25_000);
  expect(done).toEqual(['renew 0', 'renew 0']);
  end();
  await clock.advance(60_000);
  expect(done).toEqual(['renew 0', 'renew 0', 'finish 0']);
  await worker.stop();
});

test('stopping lets the present job end and takes no other', async () => {
  let end = (): void => undefined;
  const { done, worker } = work(['mail', 'mail'], () => new Promise<void>((resolve) => (end = resolve)));
  await settle();
  const stopped = worker.stop();
  end();
  await stopped;
  expect(done).toEqual(['finish 0']);
});

test('a queue that cannot be reached is asked again later', async () => {
  const clock = new VirtualClock(0, settle);
  const { queue, done } = listQueue(['mail']);
  let away = true;
  const problems: unknown[] = [];
  const take: JobQueue['take'] = (kinds) => (away ? Promise.reject(new Error('away')) : queue.take(kinds));
  const worker = startJobWorker({
    queue: { ...queue, take },
    clock,
    handlers: { mail: () => Promise.resolve() },
    onProblem: ({ error }) => problems.push(error),
  });
  await clock.advance(2500);
  expect(problems.length).toBeGreaterThan(1);
  away = false;
  await clock.advance(1000);
  expect(done).toEqual(['finish 0']);
  await worker.stop();
});
