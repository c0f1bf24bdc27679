import { decodeLine, encode, NO_SESSION, type EventMessage, type Order, type Reply } from '@/firmware-protocol/codec';
import type { ByteLine } from '@/server/interfaces/byte-line';
import type { LinkBench } from './bench';

/** Speaks the protocol by hand: for what a well-behaved driver never does. */
export class RawPeer {
  readonly lines: string[] = [];
  session = NO_SESSION;
  private constructor(
    private readonly bench: LinkBench,
    readonly epoch: number,
  ) {}
  private line: ByteLine | null = null;

  static async open(bench: LinkBench, epoch: number): Promise<RawPeer> {
    const peer = new RawPeer(bench, epoch);
    peer.line = await bench.factory.open({ onLine: (text) => peer.lines.push(text), onClosed: () => undefined });
    peer.line.write('\n');
    const reply = await peer.ask({ word: 'hello', major: 1, minor: 0 }, 1);
    if (reply.body.word !== 'hi') throw new Error(`hello was answered ${JSON.stringify(reply.body)}`);
    peer.session = reply.body.session;
    return peer;
  }

  text(order: Order, number: number): string {
    return encode({ kind: 'request', epoch: this.epoch, session: order.word === 'hello' ? NO_SESSION : this.session, number, order });
  }

  /** Writes a request and waits for the next reply to it; one to another driver before this one may still come in. */
  async put(request: string): Promise<string> {
    const [, , session, number] = request.split(' ');
    const replies = () => this.lines.filter((line) => line.startsWith(`r ${session} ${number} `));
    const before = replies().length;
    this.line?.write(request);
    await this.bench.until(`a reply to ${request.trim()}`, () => replies().length > before, 3_000);
    return replies()[before] as string;
  }

  async ask(order: Order, number: number): Promise<Reply> {
    return decodeLine(await this.put(this.text(order, number))) as Reply;
  }

  events(): EventMessage[] {
    return this.lines.map(decodeLine).filter((item): item is EventMessage => item.kind === 'event');
  }

  async close(): Promise<void> {
    await this.line?.close();
  }
}
