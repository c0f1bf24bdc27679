import { once } from 'node:events';
import { addMembers } from './lib/people';
import { withServerHere, type ServerHere } from './lib/server-here';
import { besideAnalyst, child, ended, stopRuns } from './lib/stop-runs';
import { quantile, report } from './report';

/**
 * From a stop that a phone sends over loopback to its bytes handed to the line, for 200 runs (`EVENFALL_BENCH_STOPS=20` for a quick look): on an idle server, with
 * 100 pages that follow the run while a million samples at a time are copied into the database, and with the same pages while the server itself brings
 * files of a million rows in and makes one report after another. The peer is the time that 16 bytes take on a wire of 115200 bit/s.
 */

const stops = Number(process.env.EVENFALL_BENCH_STOPS ?? 200);
const pages = 100;
const viewers = 20;
const wireMs = (16 * 10_000) / 115_200;

async function measure(here: ServerHere, writtenNs: readonly bigint[]): Promise<void> {
  const { database, address } = here;
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
  const full = await besideAnalyst(here, async (analysed) => {
    const values = await stopRuns({ ...setting, pages }, writtenNs);
    if (analysed.imports === 0 || analysed.reports === 0 || analysed.wrong.length > 0)
      throw new Error(`no import or no report came to its end beside the stops: ${JSON.stringify(analysed)}`);
    return values;
  });
  latency('full', full, 150);
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
