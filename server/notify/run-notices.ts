import * as z from 'zod';
import { worryUtcMs } from '@/shared/alarms/rings';
import { isWithinHours } from '@/shared/alarms/hours';
import { formatClock, formatClockWithZone } from '@/shared/lib/format-time';
import type { JobHandlers } from '../interfaces/jobs';
import { callMembersOf } from '../store/calls';
import type { Handle } from '../store/database';
import { enqueueJob } from '../store/jobs';
import { findRun, type RunRecord } from '../store/runs-read';
import { oneLine, tellPerson, type TellParts, worthAnotherTry } from './tell';

/** What whoever started a run hears of it: that it began and until when nobody need worry, that it is held, and how it ended. */

const runNoticeKind = 'run.notice';
const topics = ['started', 'held', 'resumed', 'stopped', 'failed', 'finished', 'prompted', 'proved', 'morning'] as const;
const noticeSchema = z.strictObject({ labId: z.string(), runId: z.string(), topic: z.enum(topics), text: z.string() });
export type RunNotice = z.infer<typeof noticeSchema>;

export const askForRunNotice = (db: Handle, notice: RunNotice, nowUtcMs: number) =>
  enqueueJob(db, { kind: runNoticeKind, payload: notice, labId: notice.labId, nowUtcMs });

const titles: Record<RunNotice['topic'], string> = {
  started: 'Started',
  held: 'Held, needs somebody',
  resumed: 'Resumed',
  stopped: 'Stopped',
  failed: 'Failed',
  finished: 'Finished',
  prompted: 'Waits for somebody',
  proved: 'First pair',
  morning: 'Morning sheet',
};

export const runNoticeJobs = (parts: TellParts): JobHandlers => ({
  [runNoticeKind]: (job) => tellOfRun(parts, noticeSchema.parse(job.payload)),
});

async function tellOfRun(parts: TellParts, notice: RunNotice): Promise<void> {
  const run = await findRun(parts.db, notice.labId, notice.runId);
  if (run === null || run.startedById === null) return;
  const starter = (await callMembersOf(parts.db, notice.labId)).find(({ userId }) => userId === run.startedById);
  if (starter === undefined) return;
  const { timeZone } = run.start;
  const clock = formatClock(parts.clock.utcMs(), { timeZone });
  const told = await tellPerson(parts, starter, {
    title: `${titles[notice.topic]}: ${oneLine(run.protocolName)} on ${oneLine(run.rigName)}`,
    paragraphs: paragraphsOf(run, notice),
    path: `/runs/${run.id}`,
    tag: `run-${run.id}`,
    quiet: starter.doNotRing !== null && isWithinHours(starter.doNotRing, clock),
  });
  const failed = worthAnotherTry(told);
  if (failed !== null) throw new Error(`the ${failed.means} message was not taken: ${failed.detail}`);
}

export function paragraphsOf(
  run: Pick<RunRecord, 'start' | 'predictedEndAt' | 'endedAt'>,
  { topic, text }: Pick<RunNotice, 'topic' | 'text'>,
): string[] {
  const { timeZone } = run.start;
  const at = (utcMs: number) => formatClockWithZone(utcMs, { timeZone, weekday: true });
  switch (topic) {
    case 'started':
    case 'resumed': {
      if (run.predictedEndAt === null) return [oneLine(text)];
      const end = `Expected to end ${at(run.predictedEndAt)}; worry after ${formatClock(worryUtcMs(run.predictedEndAt), { timeZone })}: if you have heard nothing by then, the server itself may be gone.`;
      return [`${oneLine(text)} ${end}`];
    }
    case 'held':
      return [`${oneLine(text)} It does not go on by itself: read why, put it right and resume it, or stop it.`];
    case 'stopped':
    case 'failed':
      return [`${oneLine(text)} Nothing moves any more.`];
    case 'prompted':
      return [`${oneLine(text)} The rig is disarmed. When it is done, arm it again at the rig and confirm on the page of the run.`];
    case 'proved':
      return [oneLine(text)];
    case 'morning':
      return text.split('\n').map(oneLine);
    case 'finished':
      return [
        `${oneLine(text)}${run.endedAt === null ? '' : ` The last step ended ${at(run.endedAt)}.`} Before you go in, look at the run: what moves, and whether the rig is armed.`,
      ];
  }
}
