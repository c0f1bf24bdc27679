import request from 'supertest';
import { databaseOfThisFile } from '@/tests/support/database';
import { mount } from '@/server/http/route-context';
import { appWith, list, sent } from './framework-app';

jest.setTimeout(60_000);
const database = databaseOfThisFile();

/** A route that stores a word and then asks the database for something that takes longer than a statement may. */
const slow = (statement: string) =>
  mount(list, async () => {
    const client = await database().connection.pool.connect();
    try {
      await client.query('begin');
      await client.query("set local statement_timeout = '50ms'");
      await client.query("insert into words values ('kept')");
      await client.query(statement);
      await client.query('commit');
      return { items: [], next: null };
    } catch (error) {
      await client.query('rollback');
      throw error;
    } finally {
      client.release();
    }
  });

test('a query beyond its time is given up with 503 in words, and what the request had begun is undone', async () => {
  const { pool } = database().connection;
  await pool.query('create table words (word text)');
  const { app } = appWith([slow('select pg_sleep(20)')]);
  const answer = await sent(request(app).get('/api/labs/lab/things')).expect(503);
  expect(answer.body).toMatchObject({
    code: 'database-away',
    detail: expect.stringMatching(/took too long .* given up\. Nothing was changed .* Try again/),
  });
  expect((await pool.query('select * from words')).rows).toEqual([]);
});

test('a statement that is wrong stays an error of the server', async () => {
  const { app } = appWith([slow('select nonsense')]);
  expect((await sent(request(app).get('/api/labs/lab/things')).expect(500)).body.code).toBe('internal');
});
