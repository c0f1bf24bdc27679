import { schedule, type ScheduledTask } from 'node-cron';
import type { Logger } from 'pino';

/** Something done now and then; `cron` is a five-field expression in UTC. */
export interface Chore {
  name: string;
  cron: string;
  work: () => Promise<void>;
}

/**
 * Runs chores at their UTC times. UTC alone: node-cron loses an hour or a day at daylight-saving changes of a local
 * zone, and UTC has none. A chore still at work is not begun twice.
 */
export function startTicks(chores: readonly Chore[], log: Logger): { stop(): Promise<void> } {
  const tasks: ScheduledTask[] = chores.map((chore) =>
    schedule(
      chore.cron,
      async () => {
        try {
          await chore.work();
        } catch (error) {
          log.error({ err: error, chore: chore.name }, 'a chore failed');
        }
      },
      { timezone: 'Etc/UTC', noOverlap: true, name: chore.name },
    ),
  );
  return {
    stop: async () => {
      for (const task of tasks) await task.destroy();
    },
  };
}
