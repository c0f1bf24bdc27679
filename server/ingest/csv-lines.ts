import { pipeline, Readable } from 'node:stream';
import { CsvError, Parser } from 'csv-parse';

/**
 * The records of a table. Lines without quotation marks, which is how nearly every instrument writes, are parted by a few searches in the text; from the first
 * line with one on the parser does it, at a third of the pace. Both leave out empty lines and lines that begin with `#`.
 */

export interface LineRecord {
  /** As written, white space around the fields included. */
  record: string[];
  /** Line of the file on which it ends, from 1. */
  line: number;
}

/** A table that ends in the midst of something. */
export class BrokenTable extends Error {
  override readonly name = 'BrokenTable';
  constructor(
    /** Line of the file, from 1; null where it is not known. */
    readonly line: number | null,
    message: string,
  ) {
    super(message);
  }
}

const longestLine = 1_000_000;
const recordsAtOnce = 500;

/**
 * Records of a text in pieces, many at a time, in their order.
 * @throws BrokenTable after the records before
 */
export async function* recordsOf(chunks: AsyncIterable<string>, delimiter: string): AsyncGenerator<LineRecord[]> {
  const source = chunks[Symbol.asyncIterator]();
  const lines = new PlainLines(delimiter);
  try {
    for (;;) {
      const next = await source.next();
      const found = next.done === true ? lines.end() : lines.take(next.value);
      if (found.length > 0) yield found;
      if (lines.left !== null) {
        yield* parsed(following(lines.left, source), delimiter, lines.count);
        return;
      }
      if (next.done === true) return;
    }
  } finally {
    await source.return?.();
  }
}

/** The lines before the first quotation mark. */
class PlainLines {
  /** Lines that were passed. */
  count = 0;
  /** What only the parser can read, from the beginning of a line on; null as long as there is no such thing. */
  left: string | null = null;
  private rest = '';

  constructor(private readonly delimiter: string) {}

  take(text: string): LineRecord[] {
    const all = this.rest === '' ? text : this.rest + text;
    const quote = all.indexOf('"');
    const limit = quote < 0 ? all.length : all.lastIndexOf('\n', quote) + 1;
    const found: LineRecord[] = [];
    let at = 0;
    for (let end = all.indexOf('\n'); end >= 0 && end < limit; end = all.indexOf('\n', at)) {
      this.line(all.slice(at, end), found);
      at = end + 1;
    }
    this.rest = all.slice(at);
    if (quote >= 0 || this.rest.length > longestLine || hasOldEnd(this.rest)) this.left = this.rest;
    return found;
  }

  end(): LineRecord[] {
    const found: LineRecord[] = [];
    if (this.rest !== '') this.line(this.rest, found);
    return found;
  }

  private line(text: string, into: LineRecord[]): void {
    this.count += 1;
    const first = text.trimStart();
    if (first.startsWith('#') || (first === '' && !text.includes(this.delimiter))) return;
    into.push({ record: text.split(this.delimiter), line: this.count });
  }
}

/** Whether lines end by a carriage return alone. */
function hasOldEnd(text: string): boolean {
  const at = text.indexOf('\r');
  return at >= 0 && at < text.length - 1;
}

async function* following(first: string, source: AsyncIterator<string>): AsyncGenerator<string> {
  yield first;
  for (let next = await source.next(); next.done !== true; next = await source.next()) yield next.value;
}

/** @param before lines of the file before the text */
async function* parsed(chunks: AsyncIterable<string>, delimiter: string, before: number): AsyncGenerator<LineRecord[]> {
  const parser = new LineParser({
    delimiter,
    relax_column_count: true,
    relax_quotes: true,
    skip_empty_lines: true,
    comment: '#',
    comment_no_infix: true,
    trim: true,
    max_record_size: longestLine,
  });
  // Whoever waits for the next record is told when the text breaks off.
  pipeline(Readable.from(chunks), parser, () => undefined);
  let found: LineRecord[] = [];
  try {
    for await (const item of parser) {
      const { record, line } = item as LineRecord;
      found.push({ record, line: before + line });
      if (found.length < recordsAtOnce) continue;
      yield found;
      found = [];
    }
    yield found;
  } catch (error) {
    if (!(error instanceof CsvError)) throw error;
    yield found;
    throw brokenBy(error, before);
  } finally {
    parser.destroy();
  }
}

function brokenBy(error: CsvError, before: number): BrokenTable {
  const line = typeof error.lines === 'number' ? before + error.lines : null;
  if (error.code === 'CSV_QUOTE_NOT_CLOSED') return new BrokenTable(line, 'a quotation mark is opened and never closed');
  if (error.code === 'CSV_MAX_RECORD_SIZE')
    return new BrokenTable(line, 'a row is longer than a million characters: is the delimiter right?');
  return new BrokenTable(line, 'the row cannot be parted into columns');
}

/** Tells the line of each record, without all else that the parser's own option would collect for each. */
class LineParser extends Parser {
  override push(record: unknown): boolean {
    return super.push(record === null ? null : { record, line: this.info.lines });
  }
}
