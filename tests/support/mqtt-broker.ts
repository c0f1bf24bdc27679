import { createServer, type AddressInfo, type Server, type Socket } from 'node:net';
import { Aedes } from 'aedes';

/** A broker of MQTT 3.1.1 on loopback that can vanish and come back at its port. */
export class TestBroker {
  private readonly sockets = new Set<Socket>();
  private constructor(
    private aedes: Aedes,
    private server: Server,
    readonly port: number,
    private readonly password: string | null,
  ) {}

  static async start(password: string | null = null, port = 0): Promise<TestBroker> {
    const aedes = await Aedes.createBroker({
      authenticate: (_client, _name, given, done) => done(null, password === null || given?.toString() === password),
    });
    const server = createServer(aedes.handle);
    await new Promise<void>((resolve) => void server.listen(port, '127.0.0.1', resolve));
    const broker = new TestBroker(aedes, server, (server.address() as AddressInfo).port, password);
    server.on('connection', (socket) => {
      broker.sockets.add(socket);
      socket.on('close', () => broker.sockets.delete(socket));
    });
    return broker;
  }

  get address(): string {
    return `mqtt://127.0.0.1:${String(this.port)}`;
  }

  get connections(): number {
    return this.sockets.size;
  }

  say(topic: string, payload: string | Buffer, how: { qos?: 0 | 1; retain?: boolean } = {}): Promise<void> {
    const packet = { cmd: 'publish' as const, topic, payload, qos: how.qos ?? 0, retain: how.retain ?? false, dup: false };
    return new Promise((resolve, reject) => this.aedes.publish(packet, (error) => (error ? reject(error) : resolve())));
  }

  async stop(): Promise<void> {
    for (const socket of this.sockets) socket.destroy();
    await new Promise<void>((resolve) => this.aedes.close(() => resolve()));
    await new Promise<void>((resolve) => void this.server.close(() => resolve()));
  }

  /** Another one at the same port. */
  again(): Promise<TestBroker> {
    return TestBroker.start(this.password, this.port);
  }
}
