import { fork, type ChildProcess } from 'node:child_process';
import { once } from 'node:events';
import { join } from 'node:path';
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
