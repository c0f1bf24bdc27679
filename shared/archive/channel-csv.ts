import { numberOfCell, readCsv } from './csv-text';
import { formatInstant, instantReader } from './instants';
import { UnusableArchive } from './unusable-archive';

/** Samples as columns: mid-exposure UTC ms, strictly growing, and values in the channel's unit. */
export interface SampleColumns {
  utcMs: Float64Array;
  value: Float64Array;
}

const columns = ['time_utc', 'value'] as const;
const plainHeader = columns.join(',');

/** One channel as CSV, with a header. */
export function channelCsv({ utcMs, value }: SampleColumns): string {
  const lines: string[] = [plainHeader];
  for (let k = 0; k < utcMs.length; k += 1) lines.push(`${formatInstant(utcMs[k] as number)},${String(value[k])}`);
  lines.push('');
  return lines.join('\n');
}

/** Path of a channel's file in the archive. Characters that file systems refuse are replaced. */
export function channelPath(name: string): string {
  return `channels/${name.replaceAll(/[\\/:*?"<>|\u0000-\u001f]/g, '_').replace(/^\.+/, '_')}.csv`;
}

/**
 * Reads the samples of one channel.
 * @throws UnusableArchive naming the row of the first sample that is none: a time that is not UTC or does not grow, a value that is not a number.
 */
export function readChannel(file: string, text: string): SampleColumns {
  const start = text.charCodeAt(0) === 0xfeff ? 1 : 0;
  const headerEnd = text.indexOf('\n');
  const header = (headerEnd < 0 ? text.slice(start) : text.slice(start, headerEnd)).trim();
  if (header !== plainHeader || text.includes('"')) return readGeneral(file, text);
  return readPlain(file, text, headerEnd < 0 ? text.length : headerEnd + 1);
}

/** A night holds half a million rows, so two unquoted columns are read without building a row at a time. */
function readPlain(file: string, text: string, from: number): SampleColumns {
  const collect = collector(file);
  let at = from;
  let row = 1;
  while (at < text.length) {
    let end = text.indexOf('\n', at);
    if (end < 0) end = text.length;
    row += 1;
    const lineEnd = text.charCodeAt(end - 1) === 13 ? end - 1 : end;
    if (lineEnd > at) {
      const comma = text.indexOf(',', at);
      if (comma < 0 || comma >= lineEnd)
        throw new UnusableArchive({ file, row }, `"${text.slice(at, Math.min(lineEnd, at + 60))}" is not a time and a value`);
      collect.add(row, text.slice(at, comma), text.slice(comma + 1, lineEnd));
    }
    at = end + 1;
  }
  return collect.done();
}

function readGeneral(file: string, text: string): SampleColumns {
  const collect = collector(file);
  for (const line of readCsv(file, text, columns)) collect.add(line.row, line.cell('time_utc').trim(), line.cell('value'));
  return collect.done();
}

function collector(file: string) {
  const read = instantReader();
  const utcMs: number[] = [];
  const value: number[] = [];
  let last = -Infinity;
  return {
    add(row: number, time: string, cell: string): void {
      const ms = read(time);
      if (Number.isNaN(ms))
        throw new UnusableArchive({ file, row, column: 'time_utc' }, `"${time}" is not a UTC time such as 2026-03-01T22:00:00.000Z`);
      if (ms <= last) throw new UnusableArchive({ file, row, column: 'time_utc' }, `${time} is not later than the time of the row before`);
      const reading = numberOfCell(cell);
      if (!Number.isFinite(reading)) {
        throw new UnusableArchive(
          { file, row, column: 'value' },
          `"${cell.trim()}" is not a number; leave out the rows that hold no reading`,
        );
      }
      last = ms;
      utcMs.push(ms);
      value.push(reading);
    },
    done: (): SampleColumns => ({ utcMs: Float64Array.from(utcMs), value: Float64Array.from(value) }),
  };
}
