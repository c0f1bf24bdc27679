import { addMembers } from '../bench/lib/people';
import { withServerHere, type ServerHere } from '../bench/lib/server-here';
import { besideAnalyst, stopRuns, type Analysed } from '../bench/lib/stop-runs';
import type { LogTold, StopTold } from '../bench/lib/stopping';
import { quantile } from '../bench/report';
import { soak } from './report';
import { DatabaseDoor } from './run/database-door';
import { countOf } from './run/real-night';

/**
 * Stops under load: 100 pages follow the run while the server brings files of a million rows in, as a person would, and makes one report after another. Each stop is
 * sent three times with one key: 1 000 times, or 10 000 as the second figure (`--rounds N`), in turns with a database, ten stops and as
 * many more as an import takes to its end, and turns of the same length in which the database goes just before the stop, so that imports are cut off. Each run is stopped once, each sending gets the same answer, the bytes are on the line within
 * 300 ms, and an import that comes to its end has stored every row.
 */
const FIRST = 1_000;
const SECOND = 10_000;
const WITHIN_MS = 300;
const load = { pages: 100, times: 3 };
const viewers = 20;
const shortestTurn = 10;

/** Turns of stops with a database and without one. */
class Turns {
  withoutDatabase = 0;
  private isWithout = false;
  private began = { number: 0, imports: 0 };
  private length = shortestTurn;

  /** Whether the next stop has no database. */
  next(number: number, imports: number): boolean {
    const stops = number - this.began.number;
    if (this.isWithout ? stops >= this.length : stops >= shortestTurn && imports > this.began.imports) {
      this.isWithout = !this.isWithout;
      this.length = stops;
      this.began = { number, imports };
    }
    if (this.isWithout) this.withoutDatabase += 1;
    return this.isWithout;
  }
}

interface Findings {
  latencyMs: number[];
  withoutDatabase: number;
  analysed: Analysed;
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

/** The whole load is there only where imports and reports come to their end. */
function wrongAnalyses({ imports, reports, wrong, broken }: Analysed): string[] {
  const none =
    imports === 0 || reports === 0
      ? [`${imports} imports and ${reports} reports came to their end; the last to break off: ${broken.why}`]
      : [];
  return [...none, ...wrong];
}

async function stopped(here: ServerHere, of: { stops: number; door: DatabaseDoor; writtenNs: bigint[] }): Promise<Findings> {
  const { database, address } = here;
  const port = Number(new URL(database.url).port);
  const violations: string[] = [];
  const [[cookie], followers] = [await addMembers(database, 'operator'), await addMembers(database, 'viewer', viewers)];
  const setting = { address, cookie, viewers: followers, stops: of.stops, ...load };
  const turns = new Turns();
  const { latencyMs, analysed } = await besideAnalyst(here, async (analysed) => {
    const latencyMs = await stopRuns(setting, of.writtenNs, {
      before: (number) => turns.next(number, analysed.imports) && of.door.cut(),
      after: (told) => {
        of.door.open(port);
        violations.push(...wrongAnswers(told));
      },
      logged: (told) => void violations.push(...wrongLog(told)),
    });
    return { latencyMs, analysed: { ...analysed } };
  });
  const late = latencyMs.flatMap((ms, number) =>
    ms <= WITHIN_MS ? [] : [`stop ${String(number)} was on the line after ${ms.toFixed(0)} ms`],
  );
  return { latencyMs, analysed, withoutDatabase: turns.withoutDatabase, violations: [...violations, ...late, ...wrongAnalyses(analysed)] };
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
  const [{ latencyMs, analysed, withoutDatabase, violations }] = found as [Findings];
  return {
    ok: violations.length === 0,
    stops,
    withoutDatabase,
    imports: analysed.imports,
    reports: analysed.reports,
    brokenOff: analysed.broken.times,
    p99Ms: Math.round(quantile(latencyMs, 0.99)),
    slowestMs: Math.round(Math.max(...latencyMs)),
    violations,
  };
});
