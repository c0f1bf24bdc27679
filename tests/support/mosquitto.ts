import { execFile, spawn, type ChildProcess } from 'node:child_process';
import { once } from 'node:events';
import { mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { createConnection, createServer, type AddressInfo } from 'node:net';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { setTimeout as pause } from 'node:timers/promises';
import { promisify } from 'node:util';
import { connectAsync } from 'mqtt';

const run = promisify(execFile);

/** Debian's Mosquitto on loopback, with TLS by a certificate of a lab's own authority and one name with a password. */
export class Mosquitto {
  readonly userName = 'evenfall';
  readonly password = 'shut-the-box';

  private constructor(
    private readonly folder: string,
    readonly port: number,
    private process: ChildProcess,
  ) {}

  static async start(): Promise<Mosquitto> {
    const folder = mkdtempSync(join(tmpdir(), 'evenfall-mosquitto-'));
    await makeCertificates(folder);
    const port = await freePort();
    const settings = [
      `listener ${String(port)} 127.0.0.1`,
      ...['cafile ca.crt', 'certfile broker.crt', 'keyfile broker.key'].map((line) => line.replace(' ', ` ${folder}/`)),
      `password_file ${folder}/passwd`,
      'allow_anonymous false',
      'persistence false',
    ];
    writeFileSync(join(folder, 'mosquitto.conf'), `${settings.join('\n')}\n`);
    writeFileSync(join(folder, 'passwd'), '', { mode: 0o600 });
    await run('mosquitto_passwd', ['-b', join(folder, 'passwd'), 'evenfall', 'shut-the-box']);
    return new Mosquitto(folder, port, await begun(folder, port));
  }

  /** The authority's certificate, PEM. */
  get ca(): string {
    return readFileSync(join(this.folder, 'ca.crt'), 'utf8');
  }

  /** By the name that its certificate bears. */
  get address(): string {
    return `mqtts://localhost:${String(this.port)}`;
  }

  async say(topic: string, payload: string): Promise<void> {
    const client = await connectAsync(this.address, { ca: this.ca, username: this.userName, password: this.password, protocolVersion: 4 });
    await client.publishAsync(topic, payload, { qos: 1 });
    await client.endAsync();
  }

  /** It is gone at once, without a word. */
  async vanish(): Promise<void> {
    if (this.process.exitCode !== null || this.process.signalCode !== null) return;
    this.process.kill('SIGKILL');
    await once(this.process, 'exit');
  }

  async again(): Promise<void> {
    this.process = await begun(this.folder, this.port);
  }

  async stop(): Promise<void> {
    await this.vanish();
    rmSync(this.folder, { recursive: true, force: true });
  }
}

async function makeCertificates(folder: string): Promise<void> {
  const openssl = (...args: string[]) => run('openssl', args, { cwd: folder });
  const key = ['-newkey', 'ec', '-pkeyopt', 'ec_paramgen_curve:prime256v1', '-nodes'];
  await openssl('req', '-x509', ...key, '-keyout', 'ca.key', '-out', 'ca.crt', '-days', '2', '-subj', '/CN=Authority of the lab');
  await openssl('req', ...key, '-keyout', 'broker.key', '-out', 'broker.csr', '-subj', '/CN=localhost');
  writeFileSync(join(folder, 'names.ext'), 'subjectAltName=DNS:localhost\n');
  const signed = [
    '-req',
    '-in',
    'broker.csr',
    '-CA',
    'ca.crt',
    '-CAkey',
    'ca.key',
    '-CAcreateserial',
    '-days',
    '2',
    '-extfile',
    'names.ext',
  ];
  await openssl('x509', ...signed, '-out', 'broker.crt');
}

async function freePort(): Promise<number> {
  const server = createServer().listen(0, '127.0.0.1');
  await once(server, 'listening');
  const { port } = server.address() as AddressInfo;
  server.close();
  await once(server, 'close');
  return port;
}

/** Runs as whoever runs the tests; waited for until its port is open. */
async function begun(folder: string, port: number): Promise<ChildProcess> {
  const asRoot = process.getuid?.() === 0 ? 'user root\n' : '';
  writeFileSync(join(folder, 'begun.conf'), asRoot + readFileSync(join(folder, 'mosquitto.conf'), 'utf8'));
  const broker = spawn('mosquitto', ['-c', join(folder, 'begun.conf')], { stdio: ['ignore', 'ignore', 'pipe'] });
  let said = '';
  broker.stderr?.on('data', (chunk: Buffer) => (said += chunk.toString()));
  for (let tries = 0; tries < 200; tries += 1) {
    if (broker.exitCode !== null) break;
    if (await isOpen(port)) return broker;
    await pause(25);
  }
  broker.kill('SIGKILL');
  throw new Error(`Mosquitto did not begin: ${said}`);
}

function isOpen(port: number): Promise<boolean> {
  return new Promise((resolve) => {
    const socket = createConnection(port, '127.0.0.1');
    socket.once('connect', () => (socket.destroy(), resolve(true)));
    socket.once('error', () => resolve(false));
  });
}
