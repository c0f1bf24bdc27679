import { fork, type ChildProcess } from 'node:child_process';
import { once } from 'node:events';
import { join } from 'node:path';
import type { AnalysingSetting, AnalysisTold } from './analysing';
import { addMembers } from './people';
import type { ServerHere } from './server-here';
import type { LogTold, StoppingSetting, StopTold } from './stopping';

export const child = (name: string, argument: string): ChildProcess =>
  fork(join(__dirname, `${name}.ts`), [argument], { execArgv: ['--import', 'tsx'] });

export async function ended(process_: ChildProcess): Promise<void> {
  const [code] = (await once(process_, 'exit')) as [number | null];
  if (code !== 0) throw new Error('a process beside the server failed');
}

export interface Around {
  /** Just before a stop is sent, and when it was answered. */
  before?(number: number): void;
  after?(told: StopTold): void;
  /** The run has ended, and the database has the whole of it. */
  logged?(told: LogTold): void;
}

/** Lets another process stop runs; the time from each stop sent to the first bytes of it on the line, ms. */
export async function stopRuns(
  setting: StoppingSetting,
  writtenNs: readonly bigint[],
  { before, after, logged }: Around = {},
): Promise<number[]> {
  const stopping = child('stopping', JSON.stringify(setting));
  const sent: bigint[] = [];
  stopping.on('message', (message: { ready: number } | StopTold | LogTold) => {
    if ('ready' in message) {
      before?.(message.ready);
      return void stopping.send('go');
    }
    if ('kinds' in message) return logged?.(message);
    sent.push(BigInt(message.sentNs));
    after?.(message);
  });
  await ended(stopping);
  return sent.map((from) => {
    const at = writtenNs.find((ns) => ns >= from);
    if (at === undefined) throw new Error('a stop never came to the line');
    return Number(at - from) / 1e6;
  });
}

/** What an analyst did beside the runs. */
export interface Analysed {
  imports: number;
  reports: number;
  wrong: string[];
  /** How often something broke off, and why it did the last time. */
  broken: { times: number; why: string };
}

/** Does `work` while an analyst brings a million samples in and has a report made, again and again. */
export async function besideAnalyst<T>(here: ServerHere, work: (analysed: Analysed) => Promise<T>): Promise<T> {
  const [cookie] = await addMembers(here.database, 'owner');
  const setting = { address: here.address, cookie, databaseUrl: here.database.url, filesDir: here.filesDir };
  const analysing = child('analysing', JSON.stringify(setting satisfies AnalysingSetting));
  const analysed: Analysed = { imports: 0, reports: 0, wrong: [], broken: { times: 0, why: '' } };
  const ready = once(analysing, 'message');
  analysing.on('message', (told: AnalysisTold) => {
    if (told === 'import') analysed.imports += 1;
    else if (told === 'report') analysed.reports += 1;
    else if (told === 'ready') return;
    else if ('wrong' in told) analysed.wrong.push(told.wrong);
    else analysed.broken = { times: analysed.broken.times + 1, why: told.broken };
  });
  const left = ended(analysing);
  await Promise.race([ready, left]);
  return work(analysed).finally(async () => {
    if (analysing.connected) analysing.disconnect();
    await left;
  });
}
