import { drizzle, type NodePgDatabase, type NodePgQueryResultHKT } from 'drizzle-orm/node-postgres';
import type { PgDatabase } from 'drizzle-orm/pg-core';
import { Pool, type PoolClient } from 'pg';
import * as schema from './schema';

export type Schema = typeof schema;
/** A database or a transaction: what the functions of the store take. */
export type Handle = PgDatabase<NodePgQueryResultHKT, Schema>;

export interface Connection {
  db: NodePgDatabase<Schema>;
  pool: Pool;
  /**
   * One transaction for work that needs the bare client (COPY) beside the handle; both speak in it. No statement
   * timeout holds in it, for bulk work takes its time; one that says nothing for half a minute is ended, so that a process that was
   * frozen in it keeps no channel locked.
   */
  bulk<T>(work: (client: PoolClient, handle: Handle) => Promise<T>): Promise<T>;
  close(): Promise<void>;
}

export interface ConnectOptions {
  url: string;
  maxConnections?: number;
  /** A statement that takes longer is cancelled, so that one bad query cannot hold a connection for ever. */
  statementTimeoutMs?: number;
  /** A transaction in which nothing is said for so long is ended, so that a process that was frozen keeps no row locked; 0: never. */
  idleInTransactionMs?: number;
  /** Told when an idle connection breaks (the database went away); the pool makes a new one by itself. */
  onLost?: (error: Error) => void;
}

/** Opens a pool of connections. Nothing is sent before the first query. Sessions speak UTC. */
export function connect({
  url,
  maxConnections = 10,
  statementTimeoutMs = 10_000,
  idleInTransactionMs = 0,
  onLost = () => undefined,
}: ConnectOptions): Connection {
  const pool = new Pool({
    connectionString: url,
    max: maxConnections,
    application_name: 'evenfall',
    options: `-c timezone=UTC -c statement_timeout=${statementTimeoutMs} -c idle_in_transaction_session_timeout=${idleInTransactionMs}`,
    connectionTimeoutMillis: 10_000,
    keepAlive: true,
  });
  pool.on('error', onLost);
  // A connection that breaks between two statements of a transaction has nobody else who listens; its next statement says so.
  pool.on('connect', (client) => client.on('error', () => undefined));
  return {
    db: givingBack(drizzle(pool, { schema }), pool),
    pool,
    bulk: (work) => inBulkTransaction(pool, work),
    close: () => pool.end(),
  };
}

/**
 * Every transaction gives its connection back, also one that broke before its first word. Drizzle's own would keep that place in the pool for ever
 * (`begin` stands before its `try`), so that after as many outages nothing could be asked any more.
 */
function givingBack(db: NodePgDatabase<Schema>, pool: Pool): NodePgDatabase<Schema> {
  const handles = new WeakMap<PoolClient, NodePgDatabase<Schema>>();
  const handleOf = (client: PoolClient) => {
    const known = handles.get(client) ?? drizzle(client, { schema });
    handles.set(client, known);
    return known;
  };
  db.transaction = async (work, config) => {
    const client = await pool.connect();
    try {
      return await handleOf(client).transaction(work, config);
    } finally {
      client.release();
    }
  };
  return db;
}

const bulkIdleMs = 30_000;

async function inBulkTransaction<T>(pool: Pool, work: (client: PoolClient, handle: Handle) => Promise<T>): Promise<T> {
  const client = await pool.connect();
  let broken: Error | undefined;
  try {
    await client.query('begin');
    await client.query(`set local statement_timeout = 0; set local idle_in_transaction_session_timeout = ${bulkIdleMs}`);
    const result = await work(client, drizzle(client, { schema }));
    await client.query('commit');
    return result;
  } catch (error) {
    await client.query('rollback').catch((failure: Error) => {
      broken = failure;
    });
    throw error;
  } finally {
    client.release(broken);
  }
}
