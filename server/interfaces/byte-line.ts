/**
 * A line of bytes to a controller: a serial port, a network serial server or the simulated controller. The link driver
 * knows nothing of what is behind it.
 */
export interface ByteLine {
  /** What is to be said of this line although it works, in words for people. */
  readonly remark?: string | undefined;
  /** Writes bytes at once. A line that does not take them by its own deadline closes; it never hangs. */
  write(bytes: string): void;
  /** Resolves when the line is free for others. */
  close(): Promise<void> | void;
}

export interface ByteLineHandlers {
  /** One received line without its line end, exactly as it came (also garbage). */
  onLine(line: string): void;
  /** The line is gone and will not come back by itself; called at most once. */
  onClosed(why: string): void;
}

export interface ByteLineFactory {
  /** Where the line goes, in words for people. */
  readonly description: string;
  /** Time of one byte on the wire, ms; absent or 0 where bytes take no time of their own (a pseudo-terminal). May change with an opening. */
  readonly byteTimeMs?: number;
  /** Opens a fresh line. Rejects with an Error whose message says what was tried and what is wrong. */
  open(handlers: ByteLineHandlers): Promise<ByteLine>;
}
