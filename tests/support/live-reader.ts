import { get, type ClientRequest, type IncomingMessage } from 'node:http';

export interface LiveEvent {
  event: string;
  id: number | null;
  data: unknown;
}

/** Reads a stream of server-sent events as a browser does (HTML Living Standard, 9.2.6), and lets a test wait for what comes. */
export class LiveReader {
  readonly events: LiveEvent[] = [];
  retryMs: number | null = null;
  comments = 0;
  ended = false;
  private rest = '';
  private readonly waiting = new Set<() => void>();

  private constructor(
    private readonly request: ClientRequest,
    readonly response: IncomingMessage,
  ) {
    response.setEncoding('utf8');
    response.on('data', (text: string) => this.read(text));
    const end = () => {
      this.ended = true;
      this.wake();
    };
    response.on('end', end);
    response.on('error', end);
    response.on('close', end);
  }

  static open(address: string, headers: Record<string, string>): Promise<LiveReader> {
    return new Promise((resolve, reject) => {
      const request = get(address, { headers, agent: false }, (response) => resolve(new LiveReader(request, response)));
      request.on('error', reject);
    });
  }

  /** Resolves as soon as `there` is true of what has come so far. */
  async until(there: (reader: LiveReader) => boolean): Promise<void> {
    while (!there(this)) {
      if (this.ended)
        throw new Error(`the stream ended after ${JSON.stringify(this.events.map(({ event, id }) => `${event} ${String(id)}`))}`);
      await new Promise<void>((resolve) => this.waiting.add(resolve));
    }
  }

  async untilEnded(): Promise<void> {
    while (!this.ended) await new Promise<void>((resolve) => this.waiting.add(resolve));
  }

  of(event: string): LiveEvent[] {
    return this.events.filter((one) => one.event === event);
  }

  lastId(): number | null {
    return this.events.reduce<number | null>((last, { id }) => id ?? last, null);
  }

  close(): void {
    this.request.destroy();
  }

  private read(text: string): void {
    const blocks = (this.rest + text).split('\n\n');
    this.rest = blocks.pop() ?? '';
    for (const block of blocks) this.readBlock(block.split('\n'));
    this.wake();
  }

  private readBlock(lines: string[]): void {
    const fields = new Map(lines.map((line) => [line.slice(0, line.indexOf(':')), line.slice(line.indexOf(':') + 1).trimStart()]));
    if (lines[0]?.startsWith(':') === true) this.comments += 1;
    if (fields.has('retry')) this.retryMs = Number(fields.get('retry'));
    const data = fields.get('data');
    if (data !== undefined)
      this.events.push({
        event: fields.get('event') ?? 'message',
        id: fields.has('id') ? Number(fields.get('id')) : null,
        data: JSON.parse(data) as unknown,
      });
  }

  private wake(): void {
    for (const resolve of this.waiting) resolve();
    this.waiting.clear();
  }
}
