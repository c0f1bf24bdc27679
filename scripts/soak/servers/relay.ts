import { connect, createServer, type ListenOptions, type NetConnectOpts, type Server } from 'node:net';

/** Leads whoever comes to one place on to another, until it is closed; a side that breaks breaks the other. */
export async function relay(from: ListenOptions, to: NetConnectOpts): Promise<Server> {
  const server = createServer((socket) => {
    const inner = connect(to);
    for (const [one, other] of [
      [socket, inner],
      [inner, socket],
    ] as const) {
      one.on('error', () => other.destroy());
      one.on('close', () => other.destroy());
      one.pipe(other);
    }
  });
  await new Promise<void>((resolve, reject) => void server.once('error', reject).listen(from, resolve));
  return server;
}
