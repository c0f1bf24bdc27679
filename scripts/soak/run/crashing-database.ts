import { execFile } from 'node:child_process';
import { connect, createServer, type AddressInfo, type Server, type Socket } from 'node:net';
import { join } from 'node:path';
import { promisify } from 'node:util';

const cluster = join(__dirname, '..', '..', 'cluster.mjs');

/**
 * A PostgreSQL cluster of its own that can be crashed and started again, behind an address that stays the same: each start takes a port of
 * its own choice.
 */
export class CrashingDatabase {
  private port = 0;
  private readonly sockets = new Set<Socket>();

  private constructor(
    private readonly name: string,
    private readonly door: Server,
    readonly url: URL,
  ) {}

  static async start(name: string): Promise<CrashingDatabase> {
    const door = createServer();
    await new Promise<void>((resolve) => void door.listen(0, '127.0.0.1', resolve));
    const address = new URL(await call('url', name));
    const database = new CrashingDatabase(name, door, new URL(address));
    database.port = Number(address.port);
    database.url.port = String((door.address() as AddressInfo).port);
    door.on('connection', (socket) => database.lead(socket));
    return database;
  }

  /** As a power cut: nothing is written any more, every connection breaks. */
  async crash(): Promise<void> {
    await call('crash', this.name);
    this.port = 0;
    for (const socket of this.sockets) socket.destroy();
  }

  async recover(): Promise<void> {
    this.port = Number(new URL(await call('url', this.name)).port);
  }

  async end(): Promise<void> {
    for (const socket of this.sockets) socket.destroy();
    this.door.close();
    await call('stop', this.name);
  }

  private lead(socket: Socket): void {
    if (this.port === 0) return void socket.destroy();
    const inner = connect(this.port, '127.0.0.1');
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

async function call(act: 'url' | 'crash' | 'stop', name: string): Promise<string> {
  const { stdout } = await promisify(execFile)(process.execPath, [cluster, act, name]);
  return stdout.trim().split('\n').at(-1) ?? '';
}
