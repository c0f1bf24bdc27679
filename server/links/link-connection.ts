import type { ByteLine, ByteLineFactory } from '../interfaces/byte-line';
import type { Cancel, Clock } from '../interfaces/clock';
import type { LinkCondition } from '../interfaces/turntable-link';

export interface ConnectionSetting {
  factory: ByteLineFactory;
  clock: Clock;
  onOpened(line: ByteLine): void;
  onLine(line: string): void;
  /** Opening failed or the line closed by itself. */
  onFailed(why: string): void;
}

const FIRST_PAUSE_MS = 250;
const LONGEST_PAUSE_MS = 5_000;

/** Opens the line and opens it anew after a failure, with pauses that grow to a bound. Each opening has a fresh line. */
export class LinkConnection {
  condition: LinkCondition = 'closed';
  detail = 'The link is closed.';
  reconnects = 0;
  private failures = 0;
  /** Marks the present opening; callbacks of earlier ones find another number and do nothing. */
  private opening = 0;
  private cancelPause: Cancel = () => undefined;

  constructor(private readonly setting: ConnectionSetting) {}

  get description(): string {
    return this.setting.factory.description;
  }

  open(): void {
    if (this.condition !== 'closed') return;
    this.condition = 'opening';
    this.detail = `Opening ${this.description} and waiting for the controller's answer.`;
    this.connect();
  }

  close(): void {
    this.opening += 1;
    this.cancelPause();
    this.condition = 'closed';
    this.detail = 'The link is closed.';
  }

  ready(remark: string | null): void {
    this.failures = 0;
    this.condition = 'ready';
    this.remark(remark);
  }

  /** What is to be said of a controller that answers; null: nothing. */
  remark(words: string | null): void {
    if (this.condition === 'ready') this.detail = words ?? 'The controller answers.';
  }

  /** The line is of no use (the caller has closed it): says why, and tries anew after a pause. */
  failed(condition: 'lost' | 'refused', why: string): void {
    this.opening += 1;
    this.condition = condition;
    this.detail = why;
    const pauseMs = Math.min(LONGEST_PAUSE_MS, FIRST_PAUSE_MS * 2 ** this.failures);
    this.failures += 1;
    this.cancelPause();
    this.cancelPause = this.setting.clock.after(pauseMs, () => {
      this.reconnects += 1;
      this.connect();
    });
  }

  private connect(): void {
    const mine = ++this.opening;
    const { factory, onOpened, onLine, onFailed } = this.setting;
    const handlers = {
      onLine: (line: string) => {
        if (mine === this.opening) onLine(line);
      },
      onClosed: (why: string) => {
        if (mine === this.opening) onFailed(why);
      },
    };
    factory.open(handlers).then(
      (line) => {
        if (mine === this.opening) onOpened(line);
        else void line.close();
      },
      (error: unknown) => {
        if (mine === this.opening) onFailed(error instanceof Error ? error.message : String(error));
      },
    );
  }
}
