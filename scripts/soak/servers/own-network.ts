import { execFile, execFileSync, spawn, type ChildProcess } from 'node:child_process';
import { once } from 'node:events';
import { mkdtempSync, rmSync } from 'node:fs';
import type { AddressInfo, Server } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { promisify } from 'node:util';
import { relay } from './relay';

const host = '127.0.0.1';
/** Free in a network where nothing else is. */
const serverPort = 4460;

/** Why this machine lets nobody make a network of its own; null where it does. */
export function networkRefusal(): string | null {
  try {
    execFileSync('unshare', ['-n', 'ip', 'link', 'set', 'lo', 'up'], { stdio: 'pipe' });
    return null;
  } catch (error) {
    return `unshare -n: ${String((error as { stderr?: Buffer }).stderr ?? error).trim() || String(error)}`;
  }
}

/**
 * A network namespace for one server: loopback alone, on which database and controller are found at their own ports, led out by way of sockets in a folder.
 * When it is cut nothing comes or goes and nobody is told, as with a plug that is pulled.
 */
export class OwnNetwork {
  private constructor(
    private readonly folder: string,
    private readonly inside: ChildProcess,
    private readonly relays: Server[],
  ) {}

  /** `outward`: ports of this machine's loopback that can be reached from inside. */
  static async make(outward: readonly number[]): Promise<OwnNetwork> {
    const folder = mkdtempSync(join(tmpdir(), 'evenfall-soak-network-'));
    const relays = await Promise.all(outward.map((port) => relay({ path: join(folder, String(port)) }, { host, port })));
    const words = [
      '-n',
      process.execPath,
      '--import',
      'tsx',
      join(__dirname, 'inside.ts'),
      folder,
      String(serverPort),
      ...outward.map(String),
    ];
    const inside = spawn('unshare', words, { stdio: ['ignore', 'pipe', 'inherit'], cwd: join(__dirname, '..', '..', '..') });
    await once(inside.stdout as NonNullable<typeof inside.stdout>, 'data');
    relays.push(await relay({ host, port: 0 }, { path: join(folder, 'inward') }));
    return new OwnNetwork(folder, inside, relays);
  }

  /** What a server is started with to be in here, and where it is then reached. */
  get place() {
    return {
      by: ['nsenter', '-t', String(this.inside.pid), '-n'],
      port: serverPort,
      reached: `http://${host}:${String((this.relays.at(-1)?.address() as AddressInfo).port)}`,
    };
  }

  cut(): Promise<void> {
    return this.set('down');
  }

  mend(): Promise<void> {
    return this.set('up');
  }

  async end(): Promise<void> {
    for (const server of this.relays) server.close();
    const gone = once(this.inside, 'exit');
    this.inside.kill('SIGKILL');
    await gone;
    rmSync(this.folder, { recursive: true, force: true });
  }

  private async set(state: 'up' | 'down'): Promise<void> {
    await promisify(execFile)('nsenter', ['-t', String(this.inside.pid), '-n', 'ip', 'link', 'set', 'lo', state]);
  }
}
