import type { ImportCheck, ImportMapping } from '@/shared/contracts/data';
import { readCsv, type CsvProblem, type CsvReading } from '@/server/ingest/csv-read';
import { greatestSpan } from '@/server/ingest/deflection-limits';
import { inTurns } from '@/server/ingest/receive-file';
import type { SampleBatch } from '@/server/interfaces/sample-store';
import { readPieces, type ImportRecord } from '@/server/store/imports';
import type { RunRecord } from '@/server/store/runs-read';
import { formatDuration } from '@/shared/lib/format-duration';
import { isTimeZone } from '@/shared/lib/is-time-zone';
import { isoOrNull } from './maker';
import { ProblemError } from './problem-error';
import { startUtcMsOf } from './run-window';
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

/** Reads the kept file with a mapping; problems of the whole file come in front. */
export async function readImport(
  services: Services,
  source: { file: ImportRecord; run: RunRecord; mapping: ImportMapping },
  take?: (batch: SampleBatch) => Promise<void>,
): Promise<CsvReading & { ok: boolean; overlap: string }> {
  const { file, run, mapping } = source;
  const nowUtcMs = services.clock.utcMs();
  const span = greatestSpan(run.start.rig, mapping.unit);
  const pieces = inTurns(readPieces(services.database.db, { labId: file.labId, importId: file.id }), services.breathe);
  const options = { mapping, limits: { greatestSpan: span === 'no-lever' ? null : span, nowUtcMs: Math.max(nowUtcMs, run.endedAt ?? 0) } };
  const reading = await readCsv(pieces, take === undefined ? options : { ...options, take });
  const overlap = overlapOf(reading, run, nowUtcMs);
  const ofFile: CsvProblem[] = [];
  if (span === 'no-lever')
    ofFile.push({
      row: null,
      column: null,
      message: `the unit ${mapping.unit} is a spot position, but the rig has no lever (distance from mirror to scale) to turn it into an angle`,
    });
  if (reading.problemCount === 0 && overlap.share === 0)
    ofFile.push({ row: null, column: null, message: `${overlap.words}: are time format, zone and start of the mapping right?` });
  const problems = [...ofFile, ...reading.problems].slice(0, 100);
  const problemCount = reading.problemCount + ofFile.length;
  return { ...reading, problems, problemCount, ok: problemCount === 0, overlap: overlap.words };
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

export const checkViewOf = (reading: Awaited<ReturnType<typeof readImport>>): ImportCheck => ({
  ok: reading.ok,
  rows: reading.rows,
  firstAt: isoOrNull(reading.firstUtcMs),
  lastAt: isoOrNull(reading.lastUtcMs),
  medianIntervalS: reading.medianIntervalS,
  problems: reading.problems,
  problemCount: reading.problemCount,
  overlap: reading.overlap,
});
