import { randomUUID } from 'node:crypto';
import { once } from 'node:events';
import { demoIds } from '@/db/demo/seed';
import { Follower } from './follower';
import { LabClient, pause } from './lab-client';
import { eventsOf } from './swings';

/** A process that starts a run, lets so many pages follow it, stops it when its parent says so, and does so again. Tells what became of each stop. */

export interface StoppingSetting {
  address: string;
  cookie: string;
  /** Of those who follow; each has six pages at most. */
  viewers: string[];
  pages: number;
  stops: number;
  /** How often each stop is sent, with one key. */
  times: number;
}

export interface StopTold {
  number: number;
  /** Nanoseconds of the clock that all processes of the machine share, as text. */
  sentNs: string;
  /** What each sending was answered: the status and the words. */
  answers: string[];
}

/** What a stopped run has in its log in the end. */
export interface LogTold {
  number: number;
  kinds: string[];
}

const longestPauseMs = 300;
const patienceMs = 60_000;

/** The database may be on its way back. */
async function patiently<T>(ask: () => Promise<T>): Promise<T> {
  for (const began = performance.now(); ; await pause(200)) {
    try {
      return await ask();
    } catch (error) {
      if (performance.now() - began > patienceMs) throw error;
    }
  }
}

/** As a phone does that had no answer yet: the last is sent when the others were answered. */
async function sendStop(lab: LabClient, runId: string, times: number): Promise<string[]> {
  const key = randomUUID();
  const send = () =>
    lab.post(`/labs/${demoIds.lab}/runs/${runId}/stop`, {}, { 'Idempotency-Key': key }).then(
      ({ status, body }) => `${String(status)} ${JSON.stringify(body)}`,
      (error: Error) => error.message,
    );
  const answers = await Promise.all(Array.from({ length: Math.max(1, times - 1) }, send));
  return times > 1 ? [...answers, await send()] : answers;
}

async function run({ address, cookie, viewers, pages, stops, times }: StoppingSetting): Promise<void> {
  const lab = new LabClient(address, cookie);
  const protocolId = await lab.issue({ formatVersion: 1, name: 'One long dwell', steps: [{ kind: 'dwell', for_s: 3600 }] });
  for (let number = 0; number < stops; number += 1) {
    // A stop ends the arm.
    await patiently(() => lab.arm());
    const runId = await lab.start(protocolId);
    const followers = Array.from({ length: pages }, (_, index) => new Follower(address, viewers[index % viewers.length] as string));
    await Promise.all(followers.map((page) => page.follow(runId)));
    // Spread over the heartbeat of the link.
    await pause(((number * 0.618) % 1) * longestPauseMs);
    process.send?.({ ready: number });
    await once(process, 'message');
    const sentNs = String(process.hrtime.bigint());
    const answers = await sendStop(lab, runId, times);
    process.send?.({ number, sentNs, answers } satisfies StopTold);
    await lab.until(runId, ({ state }) => state === 'stopped');
    if (times > 1) {
      const kinds = await patiently(async () => {
        const found = (await eventsOf(lab, runId)).map(({ kind }) => kind);
        if (!found.includes('stopped')) throw new Error('the database has not the end of the run yet');
        return found;
      });
      process.send?.({ number, kinds } satisfies LogTold);
    }
    for (const page of followers) page.leave();
  }
  process.disconnect();
}

void run(JSON.parse(process.argv[2] as string) as StoppingSetting);
