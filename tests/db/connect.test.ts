import { sql } from 'drizzle-orm';
import type { PoolClient } from 'pg';
import { connect } from '@/db/connect';
import { freshDatabase, type TestDatabase } from '../support/database';

let database: TestDatabase;
beforeAll(async () => {
  database = await freshDatabase();
}, 60_000);
afterAll(() => database.drop());

/** The line to the database breaks just when the pool hands the connection out. */
const breaks = (client: PoolClient) => (client as unknown as { connection: { stream: { destroy(): void } } }).connection.stream.destroy();

test('a transaction whose connection broke before its first word gives its place in the pool back', async () => {
  const connection = connect({ url: database.url, maxConnections: 1 });
  const ask = () => connection.db.transaction((tx) => tx.execute(sql`select 1 as one`));
  for (let outage = 0; outage < 3; outage += 1) {
    connection.pool.once('acquire', breaks);
    await expect(ask()).rejects.toThrow();
    expect((await ask()).rows).toEqual([{ one: 1 }]);
  }
  await connection.close();
});

test('what a transaction did is undone when it fails, and kept when it does not', async () => {
  const { db } = database.connection;
  await db.execute(sql`create table kept (word text)`);
  const write = (word: string, fails: boolean) =>
    db.transaction(async (tx) => {
      await tx.execute(sql`insert into kept values (${word})`);
      if (fails) throw new Error('no');
    });
  await expect(write('lost', true)).rejects.toThrow('no');
  await write('there', false);
  expect((await db.execute(sql`select word from kept`)).rows).toEqual([{ word: 'there' }]);
});
