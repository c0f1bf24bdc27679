import { Client } from 'pg';

export interface Listening {
  /** Sends payloads, each shorter than 8000 bytes, in one transaction: all of them come, or none does. */
  notify(payloads: readonly string[]): Promise<void>;
  close(): Promise<void>;
}

export interface ListenOptions {
  url: string;
  /** A name of letters, digits and underscores. */
  channel: string;
  onPayload(payload: string): void;
  /** The connection broke; nothing is heard any more. */
  onLost(error: Error): void;
}

/** One connection that listens on a channel and speaks on it (LISTEN, NOTIFY). Rejects where the database does not answer. */
export async function listenOn({ url, channel, onPayload, onLost }: ListenOptions): Promise<Listening> {
  const client = new Client({
    connectionString: url,
    application_name: 'evenfall post',
    options: '-c timezone=UTC -c statement_timeout=2000',
    connectionTimeoutMillis: 5_000,
    keepAlive: true,
  });
  let closed = false;
  const lost = (error: Error) => {
    if (closed) return;
    closed = true;
    client.end().catch(() => undefined);
    onLost(error);
  };
  client.on('error', lost);
  client.on('end', () => lost(new Error('Connection terminated')));
  client.on('notification', ({ payload }) => onPayload(payload ?? ''));
  try {
    await client.connect();
    await client.query(`listen ${channel}`);
  } catch (error) {
    closed = true;
    client.end().catch(() => undefined);
    throw error;
  }
  let last: Promise<unknown> = Promise.resolve();
  return {
    notify: async (payloads) => {
      const say = () => client.query('select pg_notify($1, piece) from unnest($2::text[]) as piece', [channel, payloads]);
      const saying = last.then(say, say);
      last = saying.catch(() => undefined);
      await saying;
    },
    close: async () => {
      closed = true;
      await last;
      await client.end();
    },
  };
}
