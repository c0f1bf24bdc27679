import { spawn, type ChildProcess } from 'node:child_process';
import { existsSync, mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { connect } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';

const root = join(__dirname, '..', '..', '..');
const installHint =
  'socat is missing: it makes the pseudo-terminal that stands for a serial port. Install it (Debian: apt-get install socat) and run the tests again.';

/** A controller process behind a pseudo-terminal whose plug can be pulled while the controller goes on. */
export class ControllerProcess {
  readonly path: string;
  private readonly folder = mkdtempSync(join(tmpdir(), 'evenfall-link-'));
  private readonly controller: ChildProcess;
  private socat: ChildProcess | null = null;
  private complaints = '';
  private talks = false;

  constructor(options: readonly string[], rig: RigDocument = demoRigWide) {
    this.path = join(this.folder, 'turntable');
    const rigFile = join(this.folder, 'rig.json');
    writeFileSync(rigFile, JSON.stringify(rig));
    const args = ['--import', 'tsx', join(root, 'server/boot/controller.ts'), '--rig', rigFile, '--control', this.control, ...options];
    this.controller = spawn(process.execPath, args, { cwd: root, env: { ...process.env, TSX_TSCONFIG_PATH: join(root, 'tsconfig.json') } });
    this.controller.stderr?.on('data', (chunk: Buffer) => (this.complaints += chunk.toString()));
    this.controller.stdout?.on('data', (chunk: Buffer) => {
      this.talks = true;
      this.socat?.stdin?.write(chunk);
    });
    this.controller.stdin?.on('error', () => undefined);
  }

  private get control(): string {
    return join(this.folder, 'control');
  }

  /** Waits until the controller listens and the pseudo-terminal is there. */
  async start(): Promise<void> {
    await this.plug();
    await this.awaited('the controller process', () => this.talks || existsSync(this.control) || this.complaints !== '');
    if (this.complaints !== '') throw new Error(this.complaints);
  }

  async plug(): Promise<void> {
    let missing = false;
    const socat = spawn('socat', ['STDIO', `PTY,link=${this.path},rawer,echo=0`], { stdio: ['pipe', 'pipe', 'ignore'] });
    socat.on('error', () => (missing = true));
    socat.stdin.on('error', () => undefined);
    socat.stdout.on('data', (chunk: Buffer) => this.controller.stdin?.write(chunk));
    this.socat = socat;
    await this.awaited('the pseudo-terminal', () => missing || existsSync(this.path));
    if (missing) throw new Error(installHint);
  }

  async unplug(): Promise<void> {
    const { socat } = this;
    this.socat = null;
    if (socat === null) return;
    socat.kill();
    await this.awaited('the end of socat', () => socat.exitCode !== null || socat.signalCode !== null);
    rmSync(this.path, { force: true });
  }

  /** Everything stands still, the board's own time too; what it is told meanwhile waits. */
  stall(): void {
    this.controller.kill('SIGSTOP');
  }

  goOn(): void {
    this.controller.kill('SIGCONT');
  }

  /** One line to the control socket; its answer. */
  tell(words: string): Promise<string> {
    return new Promise((done, failed) => {
      const socket = connect(this.control, () => socket.write(`${words}\n`));
      socket.setEncoding('utf8');
      socket.on('error', failed);
      socket.on('data', (answer: string) => {
        socket.end();
        done(answer.trim());
      });
    });
  }

  async dispose(): Promise<void> {
    await this.unplug();
    this.goOn();
    this.controller.kill();
    await this.awaited('the end of the controller process', () => this.controller.exitCode !== null || this.controller.signalCode !== null);
    rmSync(this.folder, { recursive: true, force: true });
  }

  private async awaited(what: string, met: () => boolean): Promise<void> {
    const giveUpMs = performance.now() + 30_000;
    while (!met()) {
      if (performance.now() > giveUpMs) throw new Error(`${what} did not come within 30 s`);
      await sleep(10);
    }
  }
}

export const sleep = (ms: number) => new Promise<void>((done) => setTimeout(done, ms));
