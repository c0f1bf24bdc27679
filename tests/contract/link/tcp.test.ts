import { createServer, type AddressInfo, type Socket } from 'node:net';
import { createLink } from '@/server/links/link-driver';
import { tcpFactory } from '@/server/links/tcp-line';
import { benchRig } from './bench';
import { linkConformance } from './conformance';
import { sleep, type ControllerProcess } from '@/scripts/soak/board/controller-process';
import { ProcessBenches } from './process-benches';
import { SerialServer } from './serial-server';

/** Real time: a controller process behind a pseudo-terminal, behind a network serial server. */
jest.setTimeout(60_000);

const servers = new Map<ControllerProcess, SerialServer>();

async function serverOf(process: ControllerProcess): Promise<SerialServer> {
  let server = servers.get(process);
  if (server === undefined) {
    server = new SerialServer();
    servers.set(process, server);
    await server.start(process.path);
  }
  return server;
}

const benchesOf = (mode: 'raw' | 'rfc2217') =>
  new ProcessBenches(async (process, clock) => {
    const { port } = await serverOf(process);
    return tcpFactory({ host: '127.0.0.1', port: port[mode], mode, baudRate: 115_200 }, clock);
  });

afterAll(() => {
  for (const server of servers.values()) server.dispose();
});

/**
 * What is above the bytes is the same code as over a pseudo-terminal, where the whole suite runs in real time. Over the
 * network each way of passing bytes runs one part that greets, moves and is stopped, so that it takes seconds; how a
 * connection breaks is below.
 */
const raw = benchesOf('raw');
linkConformance(raw.maker('a network serial server, raw'), ['orders']);
linkConformance(benchesOf('rfc2217').maker('a network serial server, RFC 2217'), ['halts']);

describe('a connection that is no controller', () => {
  const { clock } = raw;
  const open: { close(): Promise<unknown> | void }[] = [];
  afterEach(async () => {
    for (const one of open.splice(0)) await one.close();
  });
  const linkTo = (port: number, mode: 'raw' | 'rfc2217' = 'raw') => {
    const link = createLink({
      factory: tcpFactory({ host: '127.0.0.1', port, mode, baudRate: 115_200 }, clock),
      clock,
      rig: benchRig,
      epoch: 1_000,
    });
    open.push(link);
    link.open();
    return link;
  };
  const until = async (met: () => boolean) => {
    for (const giveUpMs = clock.monotonicMs() + 20_000; !met() && clock.monotonicMs() < giveUpMs;) await sleep(10);
  };
  /** A server of a few lines; gives its port. */
  const serve = async (talk: (socket: Socket) => void): Promise<number> => {
    const sockets = new Set<Socket>();
    const server = createServer((socket) => {
      sockets.add(socket);
      socket.on('error', () => undefined);
      talk(socket);
    });
    open.push({
      close: () => {
        for (const socket of sockets) socket.destroy();
        server.close();
      },
    });
    await new Promise<void>((done) => server.listen(0, '127.0.0.1', done));
    return (server.address() as AddressInfo).port;
  };

  test('because nothing listens is told, and is not ready', async () => {
    const port = await serve(() => undefined);
    await open.pop()?.close();
    const link = linkTo(port);
    await until(() => link.health().condition === 'lost');
    expect(link.health()).toMatchObject({
      condition: 'lost',
      detail: `Nothing listens at 127.0.0.1:${port}. Start the serial server there, or check the port number.`,
    });
  });

  test('because the port behind the server is gone, or taken, is told in clear words', async () => {
    const server = new SerialServer();
    open.push({ close: () => server.dispose() });
    await server.start('/tmp/no-such-turntable');
    const link = linkTo(server.port.raw);
    await until(() => link.health().condition === 'lost');
    expect(link.health()).toMatchObject({ condition: 'lost', discardedLines: 0 });
    expect(link.health().detail).toBe(
      `The serial server at 127.0.0.1:${server.port.raw} cannot open its port. Check that the controller is plugged in there.`,
    );
    const port = await serve((socket) => socket.end('Port already in use\r\n'));
    const second = linkTo(port);
    await until(() => second.health().condition === 'lost');
    expect(second.health().detail).toBe(
      `The serial port behind 127.0.0.1:${port} is in use by another connection. End that one, then this one opens by itself.`,
    );
  });

  test('because the server knows no RFC 2217 is told so', async () => {
    const plain = linkTo(await serve((socket) => socket.on('data', () => socket.write(Buffer.from([255, 254, 44])))), 'rfc2217');
    await until(() => plain.health().condition === 'lost');
    expect(plain.health().detail).toContain('it does not know RFC 2217; choose raw, or switch RFC 2217 on there');
  });

  test('because it only accepts is never ready; one that falls silent though it looks open is closed, and comes back', async () => {
    const process = await raw.start('--homed', '--warned');
    open.push({ close: () => process.dispose() });
    const server = await serverOf(process);
    const link = linkTo(server.port.raw);
    await until(() => link.health().condition === 'ready');
    server.freeze();
    const silent = linkTo(await serve((socket) => socket.resume()));
    await until(() => silent.health().condition !== 'opening');
    expect(silent.health()).toMatchObject({ condition: 'lost', detail: expect.stringContaining('Nothing answers at 127.0.0.1') });
    await until(() => link.health().condition === 'lost');
    expect(link.health().detail).toContain('No valid reply from 127.0.0.1');
    server.thaw();
    await until(() => link.health().condition === 'ready');
    expect(link.health().condition).toBe('ready');
    expect(link.health().reconnects).toBeGreaterThan(0);
  });
});
