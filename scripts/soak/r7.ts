import { once } from 'node:events';
import { addMembers } from '../bench/lib/people';
import { withServerHere, type ServerHere } from '../bench/lib/server-here';
import { child, ended, stopRuns } from '../bench/lib/stop-runs';
import type { LogTold, StopTold } from '../bench/lib/stopping';
import { soak } from './report';
import { DatabaseDoor } from './run/database-door';
import { countOf } from './run/real-night';

/**
 * Stops under load: 100 pages follow the run while a million samples at a time are copied into the database, each stop is sent three times with one
 * key, and every other one while the server has no database: 1 000 times, or 10 000 as the second figure (`--rounds N`). Each run is stopped once, each
 * sending gets the same answer, and the bytes are on the line within 300 ms.
 */
const FIRST = 1_000;
const SECOND = 10_000;
const WITHIN_MS = 300;
const load = { pages: 100, times: 3 };
const viewers = 20;

interface Findings {
  latencyMs: number[];
  violations: string[];
}

/** A repeat that comes before the first is answered may be told to ask again. */
function wrongAnswers({ number, answers }: StopTold): string[] {
  const given = answers.filter((answer) => !answer.includes('still-running'));
  const right = given.every((answer) => answer.startsWith('202 ') && answer === given[0]) && given.includes(answers.at(-1) ?? '');
  return right ? [] : [`stop ${String(number)} was answered ${answers.join(' | ')}`];
}

function wrongLog({ number, kinds }: LogTold): string[] {
  const count = (kind: string) => kinds.filter((one) => one === kind).length;
  const [asked, stopped] = [count('stop-requested'), count('stopped')];
  return asked === 1 && stopped === 1 ? [] : [`stop ${String(number)} is ${asked} times in the log as asked, ${stopped} times as done`];
}

async function stopped(
  { database, address }: ServerHere,
  of: { stops: number; door: DatabaseDoor; writtenNs: bigint[] },
): Promise<Findings> {
  const port = Number(new URL(database.url).port);
  const violations: string[] = [];
  const [[cookie], followers] = [await addMembers(database, 'operator'), await addMembers(database, 'viewer', viewers)];
  const copying = child('copying', database.url);
  await once(copying, 'message');
  const setting = { address, cookie, viewers: followers, stops: of.stops, ...load };
  const stopping = stopRuns(setting, of.writtenNs, {
    before: (number) => number % 2 === 1 && of.door.cut(),
    after: (told) => {
      of.door.open(port);
      violations.push(...wrongAnswers(told));
    },
    logged: (told) => void violations.push(...wrongLog(told)),
  });
  const latencyMs = await stopping.finally(async () => {
    copying.disconnect();
    await ended(copying);
  });
  const late = latencyMs.flatMap((ms, number) =>
    ms <= WITHIN_MS ? [] : [`stop ${String(number)} was on the line after ${ms.toFixed(0)} ms`],
  );
  return { latencyMs, violations: [...violations, ...late] };
}

soak('r7', async (args) => {
  const stops = countOf(args, { first: FIRST, second: SECOND });
  const door = await DatabaseDoor.build();
  door.open(Number(new URL(process.env.EVENFALL_DATABASE_ADMIN_URL ?? '').port));
  const writtenNs: bigint[] = [];
  const ear = (_: string, { order }: { order: { word: string } }) => {
    if (order.word === 'stop') writtenNs.push(process.hrtime.bigint());
  };
  const found: Findings[] = [];
  await withServerHere({ ear, through: (url) => door.through(url) }, async (here) => {
    found.push(await stopped(here, { stops, door, writtenNs }));
  }).finally(() => door.end());
  const { latencyMs = [], violations = [] } = found[0] ?? {};
  return {
    ok: violations.length === 0,
    stops,
    withoutDatabase: Math.floor(stops / 2),
    slowestMs: Math.round(Math.max(...latencyMs)),
    violations,
  };
});
