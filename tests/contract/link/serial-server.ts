import { spawn, type ChildProcess } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { connect, createServer, type AddressInfo } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { sleep } from '@/scripts/soak/board/controller-process';

/** Debian's ser2net in front of a port: one TCP port that passes bytes as they are, one that speaks Telnet with RFC 2217. */
export class SerialServer {
  private readonly folder = mkdtempSync(join(tmpdir(), 'evenfall-serial-server-'));
  private server: ChildProcess | null = null;
  readonly port: { raw: number; rfc2217: number } = { raw: 0, rfc2217: 0 };

  async start(path: string): Promise<void> {
    [this.port.raw, this.port.rfc2217] = await Promise.all([freePort(), freePort()]);
    const config = join(this.folder, 'ser2net.yaml');
    const connection = (name: string, accepter: string) =>
      `connection: &${name}\n  accepter: ${accepter}\n  connector: serialdev,${path},115200n81,local\n  options:\n    chardelay: false\n`;
    writeFileSync(
      config,
      connection('raw', `tcp(nodelay),127.0.0.1,${this.port.raw}`) +
        connection('telnet', `telnet(rfc2217),tcp(nodelay),127.0.0.1,${this.port.rfc2217}`),
    );
    this.server = spawn('ser2net', ['-n', '-c', config], {
      stdio: 'ignore',
      env: { ...process.env, PATH: `${process.env.PATH ?? ''}:/usr/sbin` },
    });
    for (let turn = 0; !(await listens(this.port.raw)); turn += 1) {
      if (turn > 300) throw new Error('ser2net does not listen. Install it (Debian: apt-get install ser2net) and run the tests again.');
      await sleep(20);
    }
  }

  /** Stops answering without closing anything, as a serial server whose network cable is pulled. */
  freeze(): void {
    this.server?.kill('SIGSTOP');
  }

  thaw(): void {
    this.server?.kill('SIGCONT');
  }

  dispose(): void {
    this.thaw();
    this.server?.kill();
    rmSync(this.folder, { recursive: true, force: true });
  }
}

function freePort(): Promise<number> {
  return new Promise((done) => {
    const probe = createServer().listen(0, '127.0.0.1', () => {
      const { port } = probe.address() as AddressInfo;
      probe.close(() => done(port));
    });
  });
}

function listens(port: number): Promise<boolean> {
  return new Promise((done) => {
    const socket = connect({ host: '127.0.0.1', port }, () => {
      socket.destroy();
      done(true);
    });
    socket.on('error', () => done(false));
  });
}
