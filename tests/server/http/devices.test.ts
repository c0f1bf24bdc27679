import request from 'supertest';
import { demoIds } from '@/db/demo/seed';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer } from '@/tests/support/lab-server';

const database = databaseOfThisFile();
let lab: LabServer;
beforeAll(async () => {
  lab = await LabServer.start(database());
}, 60_000);
afterAll(() => lab.stop());

const base = `/labs/${demoIds.lab}/rigs/${demoIds.rig}/devices`;
const spot = { name: 'spot', role: 'deflection', unit: 'mm', rateHz: 2 };
const temperature = { name: 'box temperature', role: 'environment', unit: 'degC', rateHz: 0.2 };
const ask = (name: string, channels: object[]) => lab.as('owner', 'POST', base).send({ name, channels });
const made = async (...channels: object[]) =>
  (await ask('Camera tracker', channels).expect(201)).body as { secret: string; token: { id: string } };

/** As a device sends it: no cookie, no header of a browser. */
const append = (secret: string, text: string) =>
  request(lab.built.app)
    .post('/api/samples')
    .set('Authorization', `Bearer ${secret}`)
    .set('Content-Type', 'application/x-ndjson')
    .send(text);
const iso = (utcMs: number) => new Date(utcMs).toISOString();
const lines = (...samples: object[]) => samples.map((sample) => JSON.stringify(sample)).join('\n');

test('a device appends to its channels; a batch that comes again is stored once', async () => {
  const { secret } = await made(spot, temperature);
  const now = lab.clock.utcMs();
  const batch = lines(
    { channel: 'spot', time_utc: iso(now - 1500), value: 1.25 },
    { channel: 'spot', time_utc: iso(now - 1000), value: -3 },
    { channel: 'box temperature', time_utc: iso(now - 1000), value: 21.5 },
  );
  expect((await append(secret, `${batch}\n`).expect(200)).body).toEqual({ stored: 3, known: 0 });
  expect((await append(secret, batch).expect(200)).body).toEqual({ stored: 0, known: 3 });
  const { body } = await lab.as('viewer', 'GET', base).expect(200);
  expect(body.channels).toEqual([
    {
      channel: expect.objectContaining({ name: 'box temperature', unit: 'degC', source: 'stream', rateHz: 0.2 }),
      lastSampleAt: iso(now - 1000),
      thinnedToAt: null,
    },
    {
      channel: expect.objectContaining({ name: 'spot', unit: 'mm', role: 'deflection' }),
      lastSampleAt: iso(now - 1000),
      thinnedToAt: null,
    },
  ]);
  expect(body.tokens[0]).toMatchObject({
    name: 'Camera tracker',
    channels: ['spot', 'box temperature'],
    lastUsedAt: iso(now),
    revokedAt: null,
  });
  expect(JSON.stringify(body)).not.toContain(secret);
});

test('what is wrong is named by its line and nothing is stored', async () => {
  const { secret } = await made({ ...spot, name: 'other spot' });
  const now = lab.clock.utcMs();
  const good = { time_utc: iso(now), value: 1 };
  const refused = await append(
    secret,
    `${JSON.stringify(good)}\nnot json\n${lines({ ...good, value: 'NaN' }, { ...good, time_utc: '14/02/2031' }, { ...good, channel: 'spot' }, { ...good, time_utc: iso(now + 120_000) }, { ...good, unit: 'mm' })}`,
  ).expect(422);
  expect(refused.headers['content-type']).toContain('application/problem+json');
  expect(refused.body).toMatchObject({
    code: 'unreadable-data',
    detail: expect.stringMatching(/^Nothing was stored. 6 lines are wrong: line 2 is not JSON/),
  });
  expect(refused.body.errors.map(({ path, message }: { path: string; message: string }) => `${path} ${message}`)).toEqual([
    expect.stringMatching(/^line 2 is not JSON/),
    expect.stringMatching(/^line 3 has the value "NaN"; a finite number is needed/),
    expect.stringMatching(/^line 4 has the time "14\/02\/2031"; write UTC as 2031-02-14T20:00:00.125Z/),
    expect.stringMatching(/^line 5 names the channel "spot", which this token may not fill/),
    expect.stringMatching(/^line 6 lies 120 s in the future by the clock of the server/),
    expect.stringMatching(/^line 7 has the unknown field "unit"/),
  ]);
  expect((await append(secret, JSON.stringify(good)).expect(200)).body).toEqual({ stored: 1, known: 0 });
  const changed = await append(secret, lines({ ...good, time_utc: iso(now - 500) }, { ...good, value: 2 })).expect(422);
  expect(changed.body.detail).toContain('line 2 has another value for other spot than was stored for that instant');
  expect((await append(secret, lines({ ...good, time_utc: iso(now - 500) })).expect(200)).body).toEqual({ stored: 1, known: 0 });
});

test('a token that is unknown or revoked opens nothing, and no token opens anything else', async () => {
  const { secret, token } = await made({ ...spot, name: 'third spot' });
  const sample = lines({ time_utc: iso(lab.clock.utcMs()), value: 1 });
  expect((await append('x'.repeat(43), sample).expect(401)).body.code).toBe('wrong-token');
  await request(lab.built.app).get(`/api${base}`).set('Authorization', `Bearer ${secret}`).expect(401);
  await append(secret, sample).expect(200);
  await lab.as('owner', 'DELETE', `${base}/${token.id}`).expect(204);
  expect((await append(secret, sample).expect(401)).body.detail).toContain('it was revoked');
  await lab
    .as('keeper', 'POST', base)
    .send({ name: 'Mine', channels: [spot] })
    .expect(403);
});

test('a device that sends too much is told when to send again', async () => {
  const { secret } = await made({ ...spot, name: 'fast spot' });
  const { devices } = lab.services.config;
  const before = { ...devices };
  Object.assign(devices, { batchesPerMinute: 2, samplesPerMinute: 10, batchBytes: 2000 });
  const start = lab.clock.utcMs() - 60_000;
  const batch = (from: number, count: number) =>
    lines(...Array.from({ length: count }, (_, k) => ({ time_utc: iso(start + from + k), value: k })));
  await append(secret, batch(0, 6)).expect(200);
  const late = await append(secret, batch(100, 6)).expect(429);
  expect(late.headers['retry-after']).toBe('12');
  expect(late.body.detail).toContain('send the batch again in 12 s');
  await lab.advance(12_000);
  await append(secret, batch(100, 6)).expect(200);
  const large = await append(secret, batch(200, 60)).expect(413);
  expect(large.body.detail).toContain('A batch has at most 2 KiB');
  Object.assign(devices, before);
});

test('a channel that is filled otherwise is not taken over', async () => {
  const refused = await ask('Tracker', [{ ...spot, name: 'deflection' }]).expect(409);
  expect(refused.body).toMatchObject({ code: 'already-exists', errors: [{ path: 'channels.0.name' }] });
  expect(refused.body.detail).toContain('is filled by the rig itself');
  await ask('Tracker', [{ ...spot, unit: 'furlong' }]).expect(400);
});
