import { connect, createServer, type AddressInfo, type Server, type Socket } from 'node:net';

/** An address that stays the same and leads to a database, wherever that is at the moment, or to none. */
export class DatabaseDoor {
  private inside: number | null = null;
  private readonly sockets = new Set<Socket>();

  private constructor(private readonly door: Server) {
    door.on('connection', (socket) => this.lead(socket));
  }

  static async build(): Promise<DatabaseDoor> {
    const server = createServer();
    await new Promise<void>((resolve) => void server.listen(0, '127.0.0.1', resolve));
    return new DatabaseDoor(server);
  }

  /** The same database by way of the door. */
  through(url: string): string {
    const led = new URL(url);
    led.port = String((this.door.address() as AddressInfo).port);
    return led.href;
  }

  open(port: number): void {
    this.inside = port;
  }

  /** Every connection breaks, and none is made. */
  cut(): void {
    this.inside = null;
    for (const socket of this.sockets) socket.destroy();
  }

  end(): void {
    this.cut();
    this.door.close();
  }

  private lead(socket: Socket): void {
    if (this.inside === null) return void socket.destroy();
    const inner = connect(this.inside, '127.0.0.1');
    for (const [one, other] of [
      [socket, inner],
      [inner, socket],
    ] as const) {
      this.sockets.add(one);
      one.on('error', () => other.destroy());
      one.on('close', () => {
        this.sockets.delete(one);
        other.destroy();
      });
      one.pipe(other);
    }
  }
}
