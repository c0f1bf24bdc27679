import { decodeLine, garbage } from './decode';
import { MAX_LINE_BYTES, type Item } from './messages';

/**
 * Cuts a stream of bytes into lines. Memory is bounded: a line that grows past the limit is dropped as a whole, up
 * to and including its line feed (SPEC 1.6), however long its sender goes on.
 */
export class LineSplitter {
  private rest = '';
  private overflowing = false;

  /** `chunk`: received bytes, one character each. Gives the items of all lines that it ended. */
  push(chunk: string): Item[] {
    const items: Item[] = [];
    let from = 0;
    for (;;) {
      const end = chunk.indexOf('\n', from);
      if (end < 0) break;
      items.push(this.end(chunk.slice(from, end)));
      from = end + 1;
    }
    this.keep(chunk.slice(from));
    return items;
  }

  private end(piece: string): Item {
    const line = this.rest + piece;
    const tooLong = this.overflowing;
    this.rest = '';
    this.overflowing = false;
    return tooLong ? garbage('length', line.slice(0, MAX_LINE_BYTES)) : decodeLine(line);
  }

  private keep(piece: string): void {
    if (this.overflowing) return;
    this.rest += piece;
    // One byte more than a whole line may have: a carriage return before the line feed is not counted.
    if (this.rest.length > MAX_LINE_BYTES) {
      this.overflowing = true;
      this.rest = this.rest.slice(0, MAX_LINE_BYTES);
    }
  }
}
