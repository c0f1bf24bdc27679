import { spawn, type ChildProcess } from 'node:child_process';
import { once } from 'node:events';
import { join } from 'node:path';
import { createInterface } from 'node:readline';

const root = join(__dirname, '..', '..', '..');

export interface ServerSetting {
  databaseUrl: string;
  /** Folder for what the server keeps outside the database. */
  stateDir: string;
  /** Further variables of its environment. */
  env?: Record<string, string>;
  /** Started by another command, at a port of its choice, and reached at another address than it says itself. */
  place?: { by: readonly string[]; port: number; reached: string };
}

/** The server as people run it: a process of its own, on loopback, on a free port. */
export class ServerProcess {
  private constructor(
    private readonly child: ChildProcess,
    readonly address: string,
    readonly setting: ServerSetting,
  ) {}

  /** Resolves as soon as the server says that it listens. */
  static async start(setting: ServerSetting): Promise<ServerProcess> {
    const { databaseUrl, stateDir, env, place } = setting;
    const [command = process.execPath, ...words] = [...(place?.by ?? []), process.execPath, 'scripts/serve.mjs'];
    const child = spawn(command, words, {
      cwd: root,
      stdio: ['ignore', 'pipe', 'inherit'],
      env: {
        ...process.env,
        NODE_ENV: 'production',
        DATABASE_URL: databaseUrl,
        PORT: String(place?.port ?? 0),
        EVENFALL_STATE_DIR: stateDir,
        EVENFALL_WEB_DIR: 'none',
        EVENFALL_VIRTUAL_EXIT_DELAY_S: '1',
        EVENFALL_LOG_LEVEL: 'error',
        EVENFALL_REQUESTS_PER_MINUTE: '1000000',
        EVENFALL_INTERVENTIONS_PER_MINUTE: '1000000',
        ...env,
      },
    });
    const address = await new Promise<string>((resolve, reject) => {
      child.once('exit', () => reject(new Error('the server ended before it listened')));
      createInterface({ input: child.stdout as NonNullable<ChildProcess['stdout']> }).on('line', (line) => {
        const at = /"listening":\s*"([^"]+)"/.exec(line)?.[1];
        if (at !== undefined) resolve(at);
      });
    });
    return new ServerProcess(child, place?.reached ?? address, setting);
  }

  get pid(): number {
    return this.child.pid ?? 0;
  }

  isAlive(): boolean {
    return this.child.exitCode === null && this.child.signalCode === null;
  }

  signal(signal: 'SIGSTOP' | 'SIGCONT' | 'SIGUSR2' | 'SIGHUP'): void {
    this.child.kill(signal);
  }

  /** Ends the process and waits until it is gone. */
  async end(signal: 'SIGTERM' | 'SIGKILL' = 'SIGTERM'): Promise<void> {
    if (!this.isAlive()) return;
    const gone = once(this.child, 'exit');
    this.child.kill(signal);
    await gone;
  }
}
