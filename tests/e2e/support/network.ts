import { connect, createServer, type AddressInfo, type Server, type Socket } from 'node:net';

/** `open`: all goes through. `slow`: answers take 3 s longer. `deaf`: what is sent arrives, no answer comes back. `cut`: nothing gets through. */
type Condition = 'open' | 'slow' | 'deaf' | 'cut';

const deafMs = 150;
const slowMs = 3000;

/** The network between a page and the server: it can be cut and mended, and it can swallow answers. */
export class Network {
  private condition: Condition = 'open';
  private readonly lines = new Set<{ near: Socket; far: Socket }>();

  private constructor(
    readonly address: string,
    private readonly server: Server,
  ) {}

  static async to(address: string): Promise<Network> {
    const { hostname, port } = new URL(address);
    const server = createServer();
    await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
    const network = new Network(`http://127.0.0.1:${String((server.address() as AddressInfo).port)}`, server);
    server.on('connection', (near) => network.carry(near, connect(Number(port), hostname)));
    return network;
  }

  become(condition: Condition): void {
    this.condition = condition;
    if (condition === 'cut') this.hangUp();
  }

  async close(): Promise<void> {
    this.hangUp();
    await new Promise((resolve) => this.server.close(resolve));
  }

  private carry(near: Socket, far: Socket): void {
    const line = { near, far };
    const end = () => {
      this.lines.delete(line);
      near.destroy();
      far.destroy();
    };
    this.lines.add(line);
    near.on('error', end).on('close', () => (this.condition === 'deaf' ? this.lines.delete(line) : end()));
    far.on('error', end).on('close', end);
    if (this.condition === 'cut') return end();
    near.on('data', (bytes) => {
      far.write(bytes);
      // As on a bad network: the line goes down with the answer still under way.
      if (this.condition === 'deaf') setTimeout(() => near.destroy(), deafMs);
    });
    far.on('data', (bytes) => {
      if (this.condition === 'open') near.write(bytes);
      else if (this.condition === 'slow') setTimeout(() => (near.destroyed ? undefined : near.write(bytes)), slowMs);
    });
  }

  private hangUp(): void {
    for (const { near, far } of this.lines) {
      near.destroy();
      far.destroy();
    }
  }
}
