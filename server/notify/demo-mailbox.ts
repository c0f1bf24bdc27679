import { mkdir, writeFile } from 'node:fs/promises';
import type { AddressInfo } from 'node:net';
import { join } from 'node:path';
import { SMTPServer, type SMTPServerDataStream, type SMTPServerSession } from 'smtp-server';
import type { Clock } from '../interfaces/clock';

export interface DemoMailbox {
  /** Where it takes mail: `smtp://127.0.0.1:<port>`. */
  url: string;
  folder: string;
  close(): Promise<void>;
}

const largestBytes = 1_048_576;

/**
 * A mail server on loopback that delivers nothing: each mail becomes one .eml file in `folder`, named by time and
 * receiver. The demo shows invitations with it, tests read what was sent.
 */
export async function startDemoMailbox({ folder, clock }: { folder: string; clock: Pick<Clock, 'utcMs'> }): Promise<DemoMailbox> {
  await mkdir(folder, { recursive: true });
  let count = 0;
  const nameFor = (session: SMTPServerSession) => {
    count += 1;
    const at = new Date(clock.utcMs()).toISOString().replaceAll(':', '-').slice(0, 19);
    const to = session.envelope.rcptTo.map((receiver) => receiver.address.replace(/[^\w.@+-]/g, '_')).join(' ');
    return `${at} ${String(count).padStart(3, '0')} ${to.slice(0, 120)}.eml`;
  };
  const server = new SMTPServer({
    authOptional: true,
    disabledCommands: ['STARTTLS', 'AUTH'],
    disableReverseLookup: true,
    size: largestBytes,
    logger: false,
    onData: (stream, session, done) => {
      bytesOf(stream)
        .then((bytes) => writeFile(join(folder, nameFor(session)), bytes, { flag: 'wx' }))
        .then(() => done())
        .catch((error: Error) => done(error));
    },
  });
  const port = await listening(server);
  return { url: `smtp://127.0.0.1:${String(port)}`, folder, close: () => new Promise((resolve) => server.close(resolve)) };
}

function listening(server: SMTPServer): Promise<number> {
  return new Promise((resolve, reject) => {
    server.once('error', reject);
    server.listen(0, '127.0.0.1', () => {
      server.off('error', reject);
      // Later errors are those of single connections (a client that hangs up) and end with them.
      server.on('error', () => undefined);
      resolve((server.server.address() as AddressInfo).port);
    });
  });
}

async function bytesOf(stream: SMTPServerDataStream): Promise<Buffer> {
  const chunks: Buffer[] = [];
  for await (const chunk of stream) chunks.push(chunk as Buffer);
  if (stream.sizeExceeded) throw new Error(`a mail of more than ${String(largestBytes)} bytes is not taken`);
  return Buffer.concat(chunks);
}
