import { createServer, type AddressInfo, type Server, type Socket } from 'node:net';
import { decodeLine, type Request } from '@/firmware-protocol/codec';
import { RealClock } from '@/server/boot/real-clock';
import type { ByteLine } from '@/server/interfaces/byte-line';
import { createSimulatedController, type SimulatedController } from '@/server/links/simulated-controller';
import { demoRigWide } from '@/shared/rig/demo-rigs';

/**
 * A controller in this process behind a TCP port, which outlives the servers that drive it. Every connection reaches it, as on a line that
 * many have tapped: nothing but the epoch fence keeps the drivers apart (SPEC 3.3). What it obeys is watched.
 */
export class WatchedController {
  readonly violations: string[] = [];
  /** Highest epoch that was greeted. */
  epoch = 0;
  /** Number of the event in which a motion began, by its tag: the ring tells it again and again. */
  private readonly beginnings = new Map<string, number>();
  private readonly asked = new Map<string, Request>();
  private readonly sockets = new Set<Socket>();
  private readonly controller: SimulatedController;
  private line: ByteLine | null = null;
  private readonly server: Server;

  private constructor() {
    const { motion } = demoRigWide;
    if (motion === undefined) throw new Error('the demo rig has motion data');
    this.controller = createSimulatedController({
      clock: new RealClock(),
      rig: motion,
      tap: { arrived: (line) => this.arrived(line), sent: (line) => this.sent(line) },
    });
    this.server = createServer((socket) => this.admit(socket));
  }

  static async start(): Promise<WatchedController> {
    const made = new WatchedController();
    made.line = await made.controller.factory.open({
      onLine: (line) => {
        for (const socket of made.sockets) socket.write(`${line}\n`);
      },
      onClosed: () => undefined,
    });
    await new Promise<void>((resolve) => void made.server.listen(0, '127.0.0.1', resolve));
    return made;
  }

  /** Motions that began. */
  get motions(): number {
    return this.beginnings.size;
  }

  get port(): number {
    return (this.server.address() as AddressInfo).port;
  }

  turnArmKey(on: boolean): void {
    this.controller.turnArmKey(on);
  }

  /** Breaks every connection, as a switch that restarts. */
  cutAll(): void {
    for (const socket of this.sockets) socket.destroy();
  }

  end(): void {
    this.cutAll();
    this.server.close();
    void this.line?.close();
  }

  private admit(socket: Socket): void {
    let rest = '';
    this.sockets.add(socket);
    socket.on('error', () => undefined);
    socket.on('close', () => this.sockets.delete(socket));
    socket.on('data', (bytes: Buffer) => {
      const lines = (rest + bytes.toString('latin1')).split('\n');
      rest = lines.pop() ?? '';
      // Whole lines only: two drivers do not write into each other's words.
      for (const line of lines) this.line?.write(`${line}\n`);
    });
  }

  private arrived(line: string): void {
    const item = decodeLine(line);
    if (item.kind === 'request') this.asked.set(`${item.session} ${String(item.number)}`, item);
  }

  private sent(line: string): void {
    const item = decodeLine(line.replace(/\n$/, ''));
    if (item.kind === 'event' && item.what.word === 'began') this.beganMotion(item.what.tag, item.number);
    if (item.kind !== 'reply') return;
    const hello = item.body.word === 'hi';
    const request = this.asked.get(`${hello ? '00000000' : item.session} ${String(item.number)}`);
    if (request === undefined || (item.body.word !== 'ok' && !hello)) return;
    const { epoch, order } = request;
    if (order.word === 'hello') {
      if (epoch < this.epoch) this.violations.push(`a greeting of epoch ${epoch} was answered after one of ${this.epoch}`);
      this.epoch = Math.max(this.epoch, epoch);
    } else if (['home', 'move', 'nudge', 'renew'].includes(order.word) && epoch !== this.epoch)
      this.violations.push(`a ${order.word} of epoch ${epoch} was obeyed after epoch ${this.epoch} had come`);
  }

  private beganMotion(tag: string, event: number): void {
    if ((this.beginnings.get(tag) ?? event) !== event) this.violations.push(`the motion ${tag} began twice`);
    this.beginnings.set(tag, event);
  }
}
