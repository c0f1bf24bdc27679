import { createHash, randomBytes } from 'node:crypto';
import { request as httpRequest } from 'node:http';
import { sql } from 'drizzle-orm';
import { demoIds } from '@/db/demo/seed';
import { tidyFiles } from '@/server/http/work/tidy-files';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';
import { MemoryObjects } from '@/tests/support/memory-objects';
import { deflectionFiles, mapping } from './deflection-files';

/** A file on its way: in parts, cut off, gone on with, thrown away; and where it is kept. */

jest.setTimeout(60_000);
const database = databaseOfThisFile();
const objects = new MemoryObjects();
const disk = { free: 1e12 };
let lab: LabServer;
let address: string;
let runId: string;
let span = { startUtcMs: 0, endUtcMs: 0 };
const labPath = `/labs/${demoIds.lab}`;
const dayMs = 86_400_000;

beforeAll(async () => {
  lab = await LabServer.start(database(), { overrides: { objects, freeBytes: async () => disk.free } });
  address = await lab.built.listen();
  runId = await lab.run(quickProtocol());
  const view = await lab.until(runId, 'finished');
  span = { startUtcMs: Date.parse(view.startedAt ?? ''), endUtcMs: Date.parse(view.endedAt ?? '') };
}, 60_000);
afterAll(() => lab.stop());

const { deflection, begin: beginWhole, put, check, commit, sent } = deflectionFiles(() => ({ lab, runId, ...span }));
const sha256 = (text: string) => createHash('sha256').update(text).digest('hex');
const begin = (text: string, fileName = 'night.csv') =>
  lab
    .as('analyst', 'POST', `${labPath}/runs/${runId}/imports`)
    .send({ fileName, bytes: text.length, changedAt: '2031-02-14T23:00:00.000Z' });
const idOf = async (text: string, fileName?: string): Promise<string> => (await begin(text, fileName).expect(201)).body.id as string;
const patch = (id: string, offset: number, part: string) =>
  lab
    .as('analyst', 'PATCH', `${labPath}/imports/${id}/content?offset=${String(offset)}`)
    .set('Content-Type', 'text/csv')
    .send(part);
const get = (id: string) => lab.as('viewer', 'GET', `${labPath}/imports/${id}`);
const original = (id: string) => lab.as('viewer', 'GET', `${labPath}/imports/${id}/original`).buffer(true);
const count = async (table: string, id: string): Promise<number> => {
  const { rows } = await database().connection.pool.query<{ n: number }>(`select count(*)::int as n from ${table} where import_id = $1`, [
    id,
  ]);
  return rows[0]?.n ?? 0;
};
const tidyAt = (days: number) =>
  tidyFiles({ ...lab.services, clock: { ...lab.clock, utcMs: () => lab.clock.utcMs() + days * dayMs } as typeof lab.clock });

/** Sends as much of a part as is said and breaks the connection off. */
function cutOff(id: string, { offset, part, after }: { offset: number; part: string; after: number }): Promise<void> {
  const url = `${address}/api${labPath}/imports/${id}/content?offset=${String(offset)}`;
  const headers = { cookie: lab.cookie('analyst'), origin: address, 'content-type': 'text/csv', 'content-length': String(part.length) };
  return new Promise((resolve) => {
    const request = httpRequest(url, { method: 'PATCH', headers });
    request.on('error', () => resolve());
    request.on('close', () => resolve());
    request.write(part.slice(0, after), () => request.destroy());
  });
}

describe('a file in parts', () => {
  test('goes on where it was cut off, and comes whole', async () => {
    const text = deflection();
    const third = Math.floor(text.length / 3);
    const id = await idOf(text);
    expect((await patch(id, 0, text.slice(0, third)).expect(200)).body).toMatchObject({ state: 'waiting', bytes: third, sha256: null });
    await cutOff(id, { offset: third, part: text.slice(third, 2 * third), after: 500 });
    // Of the part that was cut off nothing counts.
    const { body } = await get(id).expect(200);
    expect(body).toMatchObject({ state: 'waiting', bytes: third, wantedBytes: text.length, changedAt: '2031-02-14T23:00:00.000Z' });
    const listed = await lab.as('viewer', 'GET', `${labPath}/runs/${runId}/imports`).expect(200);
    expect(listed.body.items[0]).toMatchObject({ id, fileName: 'night.csv', createdBy: expect.any(String) });
    await patch(id, third, text.slice(third, 2 * third)).expect(200);
    const last = await patch(id, 2 * third, text.slice(2 * third)).expect(200);
    expect(last.body).toMatchObject({ state: 'received', bytes: text.length, sha256: sha256(text), preview: { mapping } });
    expect(await count('import_pieces', id)).toBe(0);
    expect((await check(id).expect(200)).body.ok).toBe(true);
    await commit(id, 'in parts').expect(200);
    const audit = await lab.as('owner', 'GET', `${labPath}/audit?kind=run`).expect(200);
    expect(JSON.stringify(audit.body.items)).toContain(sha256(text));
  });

  test('a part elsewhere than at the end of what has come is refused, and told where that is', async () => {
    const text = deflection();
    const id = await idOf(text);
    await patch(id, 0, text.slice(0, 100)).expect(200);
    for (const offset of [0, 99, 101]) {
      const { body } = await patch(id, offset, text.slice(offset, offset + 50)).expect(409);
      expect(body.detail).toBe(`100 bytes of night.csv have come; the next part begins there, not at ${String(offset)}.`);
      expect(body.errors).toEqual([{ path: 'offset', message: '100' }]);
    }
    // The answer to the last part was lost: it is not there twice.
    await patch(id, 100, text.slice(100)).expect(200);
    expect((await patch(id, 100, text.slice(100)).expect(409)).body.detail).toContain('has come already');
    expect((await get(id)).body).toMatchObject({ state: 'received', bytes: text.length });
  });

  test('two who send the same part at once: one of them counts', async () => {
    const text = deflection();
    const id = await idOf(text);
    const answers = await Promise.all(Array.from({ length: 4 }, () => patch(id, 0, text)));
    expect(answers.filter(({ status }) => status === 200).length).toBeGreaterThanOrEqual(1);
    expect(answers.every(({ status }) => status === 200 || status === 409)).toBe(true);
    expect((await get(id)).body).toMatchObject({ state: 'received', sha256: sha256(text) });
  });

  test('more than was said, more than the server takes, and a part that is too large are refused with words', async () => {
    const id = await idOf('x'.repeat(100));
    expect((await patch(id, 0, 'x'.repeat(101)).expect(400)).body.detail).toContain('was said to have 100 bytes, and more came');
    const huge = await lab
      .as('analyst', 'POST', `${labPath}/runs/${runId}/imports`)
      .send({ fileName: 'years.csv', bytes: 4_194_305 })
      .expect(413);
    expect(huge.body.detail).toBe('years.csv is larger than 4 MiB. Cut it into parts, or leave out columns that are not needed.');
    expect((await patch(await beginWhole(), 0, 'x').expect(409)).body.detail).toContain('was begun without its length');
    await patch(id, 0, '\n'.repeat(8 * 1_048_576 + 1)).expect(413);
    await patch(id, -1, 'x').expect(400);
  });

  test('is thrown away by whoever cancels; a stored one is not', async () => {
    const text = deflection();
    const id = await idOf(text);
    await patch(id, 0, text.slice(0, 1000)).expect(200);
    expect(await count('import_pieces', id)).toBe(1);
    await lab.as('viewer', 'DELETE', `${labPath}/imports/${id}`).expect(403);
    await lab.as('analyst', 'DELETE', `${labPath}/imports/${id}`).expect(204);
    expect(await count('import_pieces', id)).toBe(0);
    await patch(id, 1000, text.slice(1000)).expect(404);
    const kept = await sent(text);
    await commit(kept, 'in parts').expect(200);
    expect((await lab.as('analyst', 'DELETE', `${labPath}/imports/${kept}`).expect(409)).body.detail).toContain('is stored already');
  });

  test('of an endless stream without a length no more is read than the server takes, and the answer says so', async () => {
    const id = await beginWhole('endless.csv');
    const answer = await new Promise<{ status: number; text: string }>((resolve, reject) => {
      const headers = { cookie: lab.cookie('analyst'), origin: address, 'content-type': 'text/csv' };
      const request = httpRequest(`${address}/api${labPath}/imports/${id}/content`, { method: 'PUT', headers }, (response) => {
        let text = '';
        response.on('data', (chunk: Buffer) => (text += chunk.toString()));
        response.on('end', () => (request.destroy(), resolve({ status: response.statusCode ?? 0, text })));
      });
      request.on('error', reject);
      const line = Buffer.from('2031-02-14T21:00:00Z,1\n'.repeat(2000));
      const pour = () => {
        while (!request.destroyed && request.write(line));
        if (!request.destroyed) request.once('drain', pour);
      };
      pour();
    });
    expect(answer.status).toBe(413);
    expect(answer.text).toContain('endless.csv is larger than 4 MiB');
    expect(await count('import_pieces', id)).toBe(0);
  });
});

describe('the file as it was sent', () => {
  test('is kept byte for byte with its SHA-256, and given back so', async () => {
    const text = `\uFEFF${deflection().replaceAll('\n', '\r\n')}# Ende – Grüße\r\n`;
    const bytes = Buffer.from(text);
    const id = await beginWhole('Nacht 14-2 (grob).CSV');
    await put(id, bytes).expect(200);
    const digest = createHash('sha256').update(bytes).digest();
    const { rows } = await database().connection.db.execute<{ object_name: string }>(sql`select object_name from imports where id = ${id}`);
    const kept = objects.kept.get(rows[0]?.object_name ?? '');
    expect(kept?.equals(bytes)).toBe(true);
    const answer = await original(id).set('Accept-Encoding', 'gzip').expect(200);
    expect(answer.headers).toMatchObject({
      'content-length': String(bytes.length),
      // RFC 9530, section 2
      'content-digest': `sha-256=:${digest.toString('base64')}:`,
      'content-disposition': 'attachment; filename="nacht-14-2-grob.CSV"',
    });
    expect(answer.headers['content-encoding']).toBeUndefined();
    expect(Buffer.from(answer.text).equals(bytes)).toBe(true);
  });

  test('that was changed in the store is neither given out whole nor stored', async () => {
    const id = await sent(deflection());
    const [name, bytes] = [...objects.kept].at(-1) ?? ['', Buffer.alloc(0)];
    const other = Buffer.from(bytes);
    other[200] = other[200] === 0x31 ? 0x32 : 0x31;
    objects.kept.set(name, other);
    await expect(original(id)).rejects.toThrow();
    for (const answer of [await check(id), await commit(id, 'spoilt')]) {
      expect(answer.status).toBe(422);
      expect(answer.body.detail).toContain('What is kept of night.csv is not what was sent: its SHA-256 is another');
    }
    objects.kept.set(name, bytes);
    expect((await check(id).expect(200)).body.ok).toBe(true);
  });

  test('cannot be kept while the store is away: nothing is lost, and an empty part at its end tries again', async () => {
    const text = deflection();
    const id = await idOf(text);
    objects.failing = new Error('no route to the store');
    const refused = await patch(id, 0, text).expect(503);
    expect(refused.body).toMatchObject({ code: 'files-away', detail: expect.stringContaining('has come but cannot be kept yet') });
    expect(refused.headers['retry-after']).toBe('60');
    expect((await get(id)).body).toMatchObject({ state: 'waiting', bytes: text.length });
    objects.failing = null;
    expect((await patch(id, text.length, '').expect(200)).body).toMatchObject({ state: 'received', sha256: sha256(text) });
    objects.failing = new Error('no route to the store');
    expect((await check(id).expect(503)).body.code).toBe('files-away');
    objects.failing = null;
    await commit(id, 'late').expect(200);
  });

  test('is refused where it would fill the disk that runs need', async () => {
    const text = deflection();
    const id = await idOf(text);
    disk.free = 1_000 * 1_048_576;
    const refused = await begin(text).expect(507);
    expect(refused.body).toMatchObject({ code: 'no-room', detail: expect.stringMatching(/1000 MiB of the disk.*1024 MiB are needed/) });
    await patch(id, 0, text).expect(507);
    await put(id, text).expect(507);
    disk.free = 1e12;
    objects.free = 5;
    await begin(text).expect(507);
    objects.free = null;
    await patch(id, 0, text).expect(200);
  });
});

describe('tidying', () => {
  test('removes what came in part after a week, what was not stored after a month, and no file that was stored', async () => {
    const text = deflection();
    const [part, received, stored] = [await idOf(text), await sent(text), await sent(text)];
    await patch(part, 0, text.slice(0, 1000)).expect(200);
    await commit(stored, 'tidied').expect(200);
    await tidyAt(6);
    await get(part).expect(200);
    await tidyAt(8);
    await get(part).expect(404);
    expect(await count('import_pieces', part)).toBe(0);
    await get(received).expect(200);
    await tidyAt(31);
    await get(received).expect(404);
    const { rows } = await database().connection.db.execute<{ name: string }>(
      sql`select object_name as name from imports where object_name is not null`,
    );
    expect([...objects.kept.keys()].sort()).toEqual(rows.map(({ name }) => name).sort());
    expect((await original(stored).expect(200)).text).toBe(text);
  });

  test('removes an object whose server died before it could say so', async () => {
    const name = `imports/${demoIds.lab}/left`;
    objects.kept.set(name, randomBytes(10));
    await database().connection.db.execute(
      sql`insert into files (name, bytes, sha256, made_at) values (${name}, 10, 'x', ${new Date(lab.clock.utcMs()).toISOString()})`,
    );
    await tidyAt(0.5);
    expect(objects.kept.has(name)).toBe(true);
    await tidyAt(2);
    expect(objects.kept.has(name)).toBe(false);
  });

  test('takes files of older versions out of the database into the store', async () => {
    const text = deflection();
    const id = await sent(text);
    await commit(id, 'moved').expect(200);
    const { pool } = database().connection;
    await pool.query('update imports set object_name = null where id = $1', [id]);
    for (const [number, part] of [text.slice(0, 700), text.slice(700)].entries())
      await pool.query('insert into import_pieces (lab_id, import_id, number, bytes) values ($1, $2, $3, $4)', [
        demoIds.lab,
        id,
        number,
        Buffer.from(part),
      ]);
    expect((await original(id).expect(200)).text).toBe(text);
    await tidyAt(0);
    expect(await count('import_pieces', id)).toBe(0);
    expect((await original(id).expect(200)).text).toBe(text);
  });
});

test('how a file was read is remembered for its rig and channel, the last time alone', async () => {
  const remembered = async () => {
    const { body } = await lab.as('viewer', 'GET', `${labPath}/rigs/${demoIds.rig}/import-mappings`).expect(200);
    return (body.items as { channelName: string }[]).filter(({ channelName }) => channelName === 'remembered');
  };
  await commit(await sent(deflection()), 'remembered').expect(200);
  expect(await remembered()).toMatchObject([{ columns: ['time_utc', 'deflection_urad'], mapping, usedBy: 'Tam Ferrowdale' }]);
  const semicolons = deflection().replaceAll(',', ';').replace('time_utc', 'time');
  await commit(await sent(semicolons), 'remembered', { delimiter: ';' }).expect(200);
  expect(await remembered()).toMatchObject([{ columns: ['time', 'deflection_urad'], mapping: { delimiter: ';' } }]);
});
