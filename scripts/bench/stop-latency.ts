import { once } from 'node:events';
import { addMembers } from './lib/people';
import { withServerHere, type ServerHere } from './lib/server-here';
import { child, ended, stopRuns } from './lib/stop-runs';
import { quantile, report } from './report';

/**
 * From a stop that a phone sends over loopback to its bytes handed to the line, for 200 runs: on an idle server, and with
 * 100 pages that follow the run while a million samples at a time are copied into the database. The peer is the time that
 * 16 bytes take on a wire of 115200 bit/s.
 */

const stops = 200;
const pages = 100;
const viewers = 20;
const wireMs = (16 * 10_000) / 115_200;

async function measure({ database, address }: ServerHere, writtenNs: readonly bigint[]): Promise<void> {
  const [[cookie], followers] = [await addMembers(database, 'operator'), await addMembers(database, 'viewer', viewers)];
  const latency = (name: string, values: number[], goal: number) =>
    report({ name: `stop-latency ${name}`, value: quantile(values, 0.99), unit: 'ms p99', goal, want: 'at most', peer: wireMs });
  const setting = { address, cookie, viewers: followers, stops, times: 1 };
  latency('idle', await stopRuns({ ...setting, pages: 0 }, writtenNs), 50);
  const copying = child('copying', database.url);
  await once(copying, 'message');
  latency('copy', await stopRuns({ ...setting, pages }, writtenNs), 150);
  copying.disconnect();
  await ended(copying);
}

async function run(): Promise<void> {
  /** When stops were handed to the line, ns. */
  const writtenNs: bigint[] = [];
  const ear = (_: string, { order }: { order: { word: string } }) => {
    if (order.word === 'stop') writtenNs.push(process.hrtime.bigint());
  };
  await withServerHere({ ear }, (here) => measure(here, writtenNs));
}

void run();
