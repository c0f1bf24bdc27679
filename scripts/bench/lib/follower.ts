import { get, type ClientRequest } from 'node:http';
import { demoIds } from '@/db/demo/seed';

const nothing = Buffer.alloc(0);
const headBytes = 64;

/** One open page that follows a run: keeps the numbers of the events and how late each came. */
export class Follower {
  /** Numbers of the events in the order in which they came. */
  readonly seqs: number[] = [];
  /** From the instant of an event to its arrival, ms; of those that happened while the stream stood. */
  readonly delaysMs: number[] = [];
  private asked: ClientRequest | null = null;
  private sinceMs = Infinity;
  private lastId: string | null = null;
  private rest: Buffer = nothing;
  ended = false;

  constructor(
    private readonly address: string,
    private readonly cookie: string,
  ) {}

  /** Opens the stream, or opens it again after what was seen last. Resolves with the first message of it. */
  follow(runId: string): Promise<void> {
    this.rest = nothing;
    this.sinceMs = Infinity;
    this.ended = false;
    const headers = { Cookie: this.cookie, ...(this.lastId === null ? {} : { 'Last-Event-ID': this.lastId }) };
    return new Promise((resolve, reject) => {
      const asked = get(`${this.address}/api/labs/${demoIds.lab}/runs/${runId}/live`, { headers, agent: false }, (response) => {
        if (response.statusCode !== 200) reject(new Error(`a live stream was answered with ${String(response.statusCode)}`));
        response.on('data', (chunk: Buffer) => {
          this.read(chunk);
          if (this.sinceMs < Infinity) resolve();
        });
        response.on('error', () => undefined);
        response.on('close', () => {
          if (asked === this.asked) this.ended = true;
        });
      });
      asked.on('error', (error) => {
        if (asked === this.asked) reject(error);
      });
      this.asked = asked;
    });
  }

  leave(): void {
    const { asked } = this;
    this.asked = null;
    asked?.destroy();
  }

  private read(chunk: Buffer): void {
    const data = this.rest.length === 0 ? chunk : Buffer.concat([this.rest, chunk]);
    let from = 0;
    for (let end = data.indexOf('\n\n'); end >= 0; end = data.indexOf('\n\n', from)) {
      this.readBlock(data.subarray(from, end));
      from = end + 2;
    }
    this.rest = data.subarray(from);
  }

  /** Only events are read whole: a thousand pages in one process must not be what is measured. */
  private readBlock(block: Buffer): void {
    const id = /^id: (\d+)\nevent: (\w+)\n/.exec(block.toString('latin1', 0, headBytes));
    if (id === null) return;
    this.lastId = id[1] as string;
    if (id[2] === 'snapshot') this.sinceMs = Math.min(this.sinceMs, Date.now());
    if (id[2] !== 'event') return;
    this.seqs.push(Number(id[1]));
    const atMs = Date.parse(/"at":"([^"]+)"/.exec(block.toString('latin1'))?.[1] ?? '');
    if (atMs > this.sinceMs) this.delaysMs.push(Date.now() - atMs);
  }
}
