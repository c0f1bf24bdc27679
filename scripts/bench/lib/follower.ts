import { get, type ClientRequest } from 'node:http';
import { demoIds } from '@/db/demo/seed';

/** One open page that follows a run: keeps the numbers of the events and how late each came. */
export class Follower {
  /** Numbers of the events in the order in which they came. */
  readonly seqs: number[] = [];
  /** From the instant of an event to its arrival, ms; of those that happened while the stream stood. */
  readonly delaysMs: number[] = [];
  private asked: ClientRequest | null = null;
  private sinceMs = Infinity;
  private lastId: string | null = null;
  private rest = '';
  ended = false;

  constructor(
    private readonly address: string,
    private readonly cookie: string,
  ) {}

  /** Opens the stream, or opens it again after what was seen last. Resolves with the first message of it. */
  follow(runId: string): Promise<void> {
    this.rest = '';
    this.sinceMs = Infinity;
    this.ended = false;
    const headers = { Cookie: this.cookie, ...(this.lastId === null ? {} : { 'Last-Event-ID': this.lastId }) };
    return new Promise((resolve, reject) => {
      const asked = get(`${this.address}/api/labs/${demoIds.lab}/runs/${runId}/live`, { headers, agent: false }, (response) => {
        if (response.statusCode !== 200) reject(new Error(`a live stream was answered with ${String(response.statusCode)}`));
        response.setEncoding('latin1');
        response.on('data', (text: string) => {
          this.read(text);
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

  private read(text: string): void {
    const blocks = (this.rest + text).split('\n\n');
    this.rest = blocks.pop() ?? '';
    for (const block of blocks) {
      const id = /^id: (\d+)\nevent: (\w+)\n/.exec(block);
      if (id === null) continue;
      this.lastId = id[1] as string;
      if (id[2] === 'snapshot') this.sinceMs = Math.min(this.sinceMs, Date.now());
      if (id[2] !== 'event') continue;
      this.seqs.push(Number(id[1]));
      const atMs = Date.parse(/"at":"([^"]+)"/.exec(block)?.[1] ?? '');
      if (atMs > this.sinceMs) this.delaysMs.push(Date.now() - atMs);
    }
  }
}
