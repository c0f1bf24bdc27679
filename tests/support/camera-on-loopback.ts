import { createServer, type IncomingMessage, type Server, type ServerResponse } from 'node:http';
import type { AddressInfo } from 'node:net';

type Answer = (req: IncomingMessage, res: ServerResponse) => void;

/** The smallest bytes that begin and end as a JPEG (ISO/IEC 10918-1 B.1.1.3) with something of its own between. */
export const jpegOf = (inside: string): Buffer =>
  Buffer.concat([Buffer.of(0xff, 0xd8, 0xff, 0xe0), Buffer.from(inside), Buffer.of(0xff, 0xd9)]);

/** A camera of the network on loopback that answers as it is told. */
export class LoopbackCamera {
  readonly asked: IncomingMessage[] = [];
  /** `name:port` */
  readonly host: string;
  answer: Answer = (_, res) => res.writeHead(200, { 'Content-Type': 'image/jpeg' }).end(jpegOf('a picture'));

  private constructor(private readonly server: Server) {
    this.host = `127.0.0.1:${String((server.address() as AddressInfo).port)}`;
    server.on('request', (req, res) => {
      this.asked.push(req);
      this.answer(req, res);
    });
  }

  static async start(): Promise<LoopbackCamera> {
    const server = createServer();
    await new Promise<void>((resolve) => void server.listen(0, '127.0.0.1', resolve));
    return new LoopbackCamera(server);
  }

  get address(): string {
    return `http://${this.host}/picture.jpg`;
  }

  async stop(): Promise<void> {
    this.server.closeAllConnections();
    await new Promise((resolve) => void this.server.close(resolve));
  }
}
