import type { ImportCheck, ImportChoices, ImportFindings, ImportMapping } from '@/shared/contracts/data';
import { readCsv, type CsvProblem, type CsvReading } from '@/server/ingest/csv-read';
import { greatestSpan } from '@/server/ingest/deflection-limits';
import { inTurns } from '@/server/ingest/receive-file';
import type { StagedFile, StagedFindings } from '@/server/store/import-commit';
import type { FarValue, FarValues, Staging } from '@/server/store/import-staging';
import type { ImportRecord } from '@/server/store/import-files';
import type { RunRecord } from '@/server/store/runs-read';
import { formatDuration } from '@/shared/lib/format-duration';
import { isTimeZone } from '@/shared/lib/is-time-zone';
import { bytesOf } from './import-file';
import { isoOrNull } from './maker';
import { ProblemError } from './problem-error';
import { startUtcMsOf, windowOf } from './run-window';
import type { Services } from './services';

/** Refuses a mapping that cannot be meant, whatever the file holds. */
export function assertMapping(mapping: ImportMapping): void {
  if (mapping.timeFormat === 'elapsed-s' && mapping.elapsedFrom === undefined)
    throw new ProblemError('invalid-input', 'Times in seconds elapsed need the instant they count from: state elapsedFrom in UTC.', [
      { path: 'mapping.elapsedFrom', message: 'an instant in UTC, for example 2031-03-14T22:00:00Z' },
    ]);
  const { timeZone, timesWithoutZoneAreUtc } = mapping;
  if (timeZone !== undefined && !isTimeZone(timeZone))
    throw new ProblemError('invalid-input', `There is no time zone ${timeZone}.`, [
      { path: 'mapping.timeZone', message: 'the name of a zone, for example Europe/Oslo' },
    ]);
  if (timeZone !== undefined && timesWithoutZoneAreUtc === true)
    throw new ProblemError('invalid-input', `Times without a zone cannot be UTC and of ${timeZone} at once; say one of both.`, [
      { path: 'mapping.timeZone', message: 'nothing, where such times are UTC' },
    ]);
  if (mapping.timeColumn === mapping.valueColumn)
    throw new ProblemError('invalid-input', 'Time and value are said to stand in the same column; choose two.', [
      { path: 'mapping.valueColumn', message: 'another column than that of the time' },
    ]);
  if (mapping.decimal === mapping.delimiter)
    throw new ProblemError('invalid-input', 'The comma cannot part the columns and be the decimal sign at once.', [
      { path: 'mapping.decimal', message: 'a sign other than the delimiter' },
    ]);
}

/** Of a file with more such values the unit is wrong, and leaving them out would not help. */
const greatestShareOfFar = 0.1;

export interface ImportReading extends CsvReading, StagedFile {
  ok: boolean;
  overlap: string;
  outOfReach: ImportFindings['outOfReach'];
}

/** Reads the kept file with a mapping and stages its rows; problems of the whole file come in front. Far values are left out where that is chosen and they are few. */
export async function readImport(
  services: Services,
  source: { file: ImportRecord; run: RunRecord; mapping: ImportMapping; choices?: Pick<ImportChoices, 'outOfReach' | 'outsideRun'> },
  staging: Staging,
): Promise<ImportReading> {
  const { file, run, mapping, choices } = source;
  const nowUtcMs = services.clock.utcMs();
  const span = greatestSpan(run.start.rig, mapping.unit);
  const pieces = inTurns(bytesOf(services, file), services.breathe);
  const limits = { nowUtcMs: Math.max(nowUtcMs, run.endedAt ?? 0) };
  const reading = await readCsv(pieces, { mapping, limits, take: staging.take });
  const overlap = overlapOf(reading, run, nowUtcMs);
  const ofFile: CsvProblem[] = [];
  if (span === 'no-lever')
    ofFile.push({
      row: null,
      column: null,
      message: `the unit ${mapping.unit} is a spot position, but the rig has no lever (distance from mirror to scale) to turn it into an angle`,
    });
  const far = span === null || span === 'no-lever' ? null : await staging.farValues(span);
  if (reading.problemCount === 0 && overlap.share === 0)
    ofFile.push({ row: null, column: null, message: `${overlap.words}: are time format, zone and start of the mapping right?` });
  const leavable = far !== null && far.count <= greatestShareOfFar * staging.rows;
  const leaves = leavable && choices?.outOfReach === 'leave-out';
  const ofRows =
    far === null || leaves
      ? []
      : far.first.map((value) => farProblem(value, { far, span: span as number, mapping, column: reading.valueColumn }));
  const problems = [...ofFile, ...[...reading.problems, ...ofRows].sort((a, b) => (a.row ?? 0) - (b.row ?? 0))].slice(0, 100);
  const problemCount = reading.problemCount + ofFile.length + (leaves ? 0 : (far?.count ?? 0));
  let leftOut = leaves ? await staging.leaveOutFar(far, span as number) : 0;
  if (choices?.outsideRun === 'leave-out') leftOut += await staging.leaveOutside(windowOf(run, services));
  return {
    ...{ ...reading, problems, problemCount, leftOut, ok: problemCount === 0, overlap: overlap.words, usualS: reading.medianIntervalS },
    outOfReach: { rows: far?.count ?? 0, leavable },
  };
}

function farProblem({ row, value }: FarValue, about: { far: FarValues; span: number; mapping: ImportMapping; column: string }): CsvProblem {
  const { far, span, mapping, column } = about;
  const short = (number: number) => `${String(Number(number.toPrecision(3)))} ${mapping.unit}`;
  return {
    row,
    column,
    message: `the value ${String(value)} ${mapping.unit} lies ${short(Math.abs(value - far.middle))} from the middle one of the file, and the pendulum can move ${short(span)} at most: is the unit right?`,
  };
}

/** How the data lie against the run, in words, and the share of the run they cover. */
function overlapOf(reading: CsvReading, run: RunRecord, nowUtcMs: number): { share: number; words: string } {
  const { firstUtcMs, lastUtcMs } = reading;
  const from = startUtcMsOf(run);
  const to = Math.max(run.endedAt ?? nowUtcMs, from + 1);
  if (firstUtcMs === null || lastUtcMs === null) return { share: 0, words: 'no row could be read' };
  const common = Math.min(to, lastUtcMs) - Math.max(from, firstUtcMs);
  if (common <= 0) {
    const side =
      lastUtcMs <= from ? `end ${spoken(from - lastUtcMs)} before the run began` : `begin ${spoken(firstUtcMs - to)} after the run ended`;
    return { share: 0, words: `the data ${side}` };
  }
  const share = Math.min(1, common / (to - from));
  const percent = Math.round(100 * share);
  return {
    share,
    words: percent < 10 ? `covers ${spanWords(common)} of the run’s ${spanWords(to - from)}` : `covers ${String(percent)} % of the run`,
  };
}

const spanWords = (ms: number) => formatDuration(ms / 1000);

function spoken(ms: number): string {
  const s = ms / 1000;
  if (s < 120) return `${String(Math.round(s))} s`;
  if (s < 7200) return `${String(Math.round(s / 60))} min`;
  return s < 172_800 ? `${String(Math.round(s / 3600))} h` : `${String(Math.round(s / 86_400))} days`;
}

export const checkViewOf = (reading: ImportReading, findings: StagedFindings): ImportCheck => ({
  ok: reading.ok,
  rows: reading.rows,
  firstAt: isoOrNull(reading.firstUtcMs),
  lastAt: isoOrNull(reading.lastUtcMs),
  medianIntervalS: reading.medianIntervalS,
  problems: reading.problems,
  problemCount: reading.problemCount,
  overlap: reading.overlap,
  findings: { ...findings, outOfReach: reading.outOfReach },
});
