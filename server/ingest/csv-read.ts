import type { ImportMapping } from '@/shared/contracts/data';
import type { RowBatch } from '../interfaces/sample-store';
import { readNumber, timeReader, UnreadableField } from './csv-fields';
import { BrokenTable, recordsOf } from './csv-lines';
import { textOf } from './csv-text';

export interface CsvProblem {
  /** Line of the file, from 1; null for a problem of the whole file. */
  row: number | null;
  column: string | null;
  message: string;
}

export interface CsvReading {
  rows: number;
  firstUtcMs: number | null;
  lastUtcMs: number | null;
  medianIntervalS: number | null;
  /** What the file calls the column of the values. */
  valueColumn: string;
  /** The first 100. */
  problems: CsvProblem[];
  problemCount: number;
}

export interface CsvLimits {
  /** Instants after this are refused, UTC ms. */
  nowUtcMs: number;
}

const problemsKept = 100;
const intervalsKept = 10_000;
const batchSize = 10_000;
const dayMs = 86_400_000;

/**
 * Reads a whole CSV as a stream: every problem by row and column, good rows to `take` in batches in their order.
 * Memory stays flat whatever the size.
 */
export async function readCsv(
  chunks: AsyncIterable<Uint8Array>,
  options: { mapping: ImportMapping; limits: CsvLimits; take?: (batch: RowBatch) => Promise<void> },
): Promise<CsvReading> {
  const reader = new RowReader(options.mapping, options.limits);
  const handover = new Handover(options.take ?? (async () => undefined));
  try {
    for await (const records of recordsOf(textOf(chunks, options.mapping.encoding), options.mapping.delimiter))
      for (const { record, line } of records) {
        reader.row(record, line);
        if (reader.pending >= batchSize) await handover.give(reader.batch());
      }
    await handover.give(reader.batch());
    await handover.end();
  } catch (error) {
    if (!(error instanceof BrokenTable)) throw error;
    reader.problem(error.line, null, error.message);
  } finally {
    await handover.end().catch(() => undefined);
  }
  return reader.result();
}

/** Hands batches over one after another; while one is being taken the next is read. */
class Handover {
  private underWay: Promise<void> = Promise.resolve();

  constructor(private readonly take: (batch: RowBatch) => Promise<void>) {}

  /** @throws what the taking of the batch before was rejected with */
  async give(batch: RowBatch): Promise<void> {
    await this.end();
    if (batch.utcMs.length === 0) return;
    this.underWay = this.take(batch);
    // Whoever waits for it next is told; until then a rejection must not count as nobody's.
    this.underWay.catch(() => undefined);
  }

  async end(): Promise<void> {
    await this.underWay;
  }
}

class RowReader {
  private readonly lines = new Float64Array(batchSize);
  private readonly utcMs = new Float64Array(batchSize);
  private readonly value = new Float64Array(batchSize);
  pending = 0;
  private rows = 0;
  private headerDone: boolean;
  private names: string[] = [];
  private firstUtcMs: number | null = null;
  private lastUtcMs: number | null = null;
  private readonly intervalsMs: number[] = [];
  private readonly problems: CsvProblem[] = [];
  private problemCount = 0;

  private readonly readTime: ReturnType<typeof timeReader>;

  constructor(
    private readonly mapping: ImportMapping,
    private readonly limits: CsvLimits,
  ) {
    this.headerDone = !mapping.headerRow;
    this.readTime = timeReader(mapping);
  }

  row(record: string[], line: number): void {
    if (!this.headerDone) {
      this.headerDone = true;
      this.names = record;
      const missing = [this.mapping.timeColumn, this.mapping.valueColumn].filter((index) => index >= record.length);
      if (missing.length > 0)
        this.problem(
          line,
          null,
          `the mapping names column ${missing.map((index) => String(index + 1)).join(' and ')}, but the file has ${String(record.length)} columns: ${record.join(', ')}`,
        );
      return;
    }
    this.rows += 1;
    const needed = Math.max(this.mapping.timeColumn, this.mapping.valueColumn) + 1;
    if (record.length < needed) {
      this.problem(line, null, `the row has ${String(record.length)} columns, the mapping needs ${String(needed)}`);
      return;
    }
    const utcMs = this.field(line, this.mapping.timeColumn, () => this.time(record[this.mapping.timeColumn]));
    const value = this.field(line, this.mapping.valueColumn, () =>
      readNumber(record[this.mapping.valueColumn], this.mapping.decimal, 'value'),
    );
    if (utcMs !== null) this.order(utcMs);
    if (utcMs === null || value === null) return;
    this.firstUtcMs ??= utcMs;
    this.lines[this.pending] = line;
    this.utcMs[this.pending] = utcMs;
    this.value[this.pending] = value;
    this.pending += 1;
  }

  private time(field: string | undefined): number {
    const utcMs = this.readTime(field);
    const last = this.lastUtcMs;
    if (utcMs > this.limits.nowUtcMs + dayMs)
      throw new UnreadableField(`the time ${iso(utcMs)} lies in the future: are time format and zone of the mapping right?`);
    if (last !== null && microseconds(utcMs) === microseconds(last))
      throw new UnreadableField(`the time ${iso(utcMs)} comes twice; each instant may have one value`);
    if (last !== null && utcMs < last)
      throw new UnreadableField(`the time goes back from ${iso(last)} to ${iso(utcMs)}; rows must be in order of time`);
    return utcMs;
  }

  private field(line: number, index: number, read: () => number): number | null {
    try {
      return read();
    } catch (error) {
      if (!(error instanceof UnreadableField)) throw error;
      this.problem(line, this.nameOf(index), error.message);
      return null;
    }
  }

  private nameOf(index: number): string {
    return this.names[index]?.trim() || `column ${String(index + 1)}`;
  }

  private order(utcMs: number): void {
    if (this.lastUtcMs !== null && this.intervalsMs.length < intervalsKept) this.intervalsMs.push(utcMs - this.lastUtcMs);
    this.lastUtcMs = utcMs;
  }

  problem(row: number | null, column: string | null, message: string): void {
    this.problemCount += 1;
    if (this.problems.length < problemsKept) this.problems.push({ row, column, message });
  }

  batch(): RowBatch {
    const batch = {
      row: this.lines.slice(0, this.pending),
      utcMs: this.utcMs.slice(0, this.pending),
      value: this.value.slice(0, this.pending),
    };
    this.pending = 0;
    return batch;
  }

  result(): CsvReading {
    if (this.rows === 0) this.problem(null, null, 'there is no row of data in the file');
    const sorted = [...this.intervalsMs].sort((a, b) => a - b);
    const median = sorted[Math.floor(sorted.length / 2)];
    return {
      rows: this.rows,
      firstUtcMs: this.firstUtcMs,
      lastUtcMs: this.lastUtcMs,
      medianIntervalS: median === undefined ? null : median / 1000,
      valueColumn: this.nameOf(this.mapping.valueColumn),
      problems: this.problems,
      problemCount: this.problemCount,
    };
  }
}

/** Instants are kept to the microsecond. */
const microseconds = (utcMs: number) => Math.round(utcMs * 1000);

const iso = (utcMs: number) => new Date(utcMs).toISOString();
