import { createHash } from 'node:crypto';
import { demoIds } from '@/db/demo/seed';
import type { ImportMapping } from '@/shared/contracts/data';
import { databaseOfThisFile } from '@/tests/support/database';
import { LabServer, quickProtocol } from '@/tests/support/lab-server';
import { deflectionFiles, mapping } from './deflection-files';

jest.setTimeout(60_000);

const database = databaseOfThisFile();
let lab: LabServer;
let runId: string;
let startUtcMs: number;
let endUtcMs: number;

const labPath = `/labs/${demoIds.lab}`;

beforeAll(async () => {
  lab = await LabServer.start(database());
  runId = await lab.run(quickProtocol());
  const view = await lab.until(runId, 'finished');
  startUtcMs = Date.parse(view.startedAt ?? '');
  endUtcMs = Date.parse(view.endedAt ?? '');
}, 60_000);
afterAll(() => lab.stop());

const files = deflectionFiles(() => ({ lab, runId, startUtcMs, endUtcMs }));
const { deflection, begin, put, check, commit, sent } = files;

const samplesOf = async (channelName: string): Promise<number> => {
  const result = await database().connection.pool.query<{ n: string }>(
    "select count(*) as n from samples join channels on channels.id = samples.channel_id where channels.name = $1 and channels.source = 'import'",
    [channelName],
  );
  return Number(result.rows[0]?.n);
};
describe('a deflection file', () => {
  test('is received, previewed, checked, stored and shown, and kept as it was sent with its SHA-256', async () => {
    const text = deflection();
    const id = await begin();
    const received = await put(id, text).expect(200);
    expect(received.body).toMatchObject({
      state: 'received',
      bytes: text.length,
      sha256: createHash('sha256').update(text).digest('hex'),
      fileName: 'night.csv',
    });
    expect(received.body.preview).toMatchObject({ mapping, ambiguous: [], columns: [{ name: 'time_utc' }, { name: 'deflection_urad' }] });

    const rows = text.trim().split('\n').length - 1;
    const checked = await check(id).expect(200);
    expect(checked.body).toMatchObject({
      ok: true,
      rows,
      problems: [],
      problemCount: 0,
      medianIntervalS: 2,
      firstAt: new Date(startUtcMs).toISOString(),
      overlap: expect.stringMatching(/^covers (9\d|100) % of the run$/),
    });
    expect(await samplesOf('readout')).toBe(0);

    const stored = await commit(id, 'readout').expect(200);
    expect(stored.body).toMatchObject({
      stored: rows,
      known: 0,
      channel: { name: 'readout', unit: 'urad', role: 'deflection', source: 'import' },
    });
    const shown = await lab.as('viewer', 'GET', `${labPath}/runs/${runId}/samples?channelId=${stored.body.channel.id}`).expect(200);
    expect(shown.body.total).toBe(rows);
    expect(shown.body.utcMs[1]).toBe(startUtcMs + 2000);
    expect(shown.body.value[1]).toBe(Number((100 * Math.sin(1 / 40)).toFixed(3)));
    const original = await lab.as('viewer', 'GET', `${labPath}/imports/${id}/original`).expect(200);
    expect(original.text).toBe(text);

    await put(id, text).expect(409);
    expect((await commit(id, 'readout').expect(409)).body.detail).toContain('is stored already');
  });

  test('that covers little of the run says how much in time, not in percent', async () => {
    const short = deflection().split('\n').slice(0, 4).join('\n');
    const checked = await check(await sent(`${short}\n`)).expect(200);
    expect(checked.body.ok).toBe(true);
    expect(checked.body.overlap).toMatch(/^covers 4.s of the run’s \d+.min( \d+.s)?$/);
  });

  test('sent again is known: nothing is stored twice, and other values at the same instants are refused', async () => {
    const again = await commit(await sent(deflection()), 'readout').expect(200);
    expect(again.body).toMatchObject({ stored: 0, known: expect.any(Number) });
    const other = await commit(
      await sent(deflection((line, index) => (index === 5 ? line.replace(/,.*/, ',99') : line))),
      'readout',
    ).expect(409);
    expect(other.body.detail).toContain(`holds another value at ${new Date(startUtcMs + 10_000).toISOString()}`);
  });

  test('goes into no channel that the rig fills itself, nor into one of another unit', async () => {
    const id = await sent(deflection());
    expect((await commit(id, 'deflection').expect(409)).body.errors[0].path).toBe('channelName');
    expect((await commit(id, 'readout', { unit: 'mrad' }).expect(409)).body.detail).toContain(
      'The channel readout is in urad, the file in mrad',
    );
  });

  test('of several megabytes in small pieces comes whole', async () => {
    const text = `${deflection().trimEnd()}\n${'# a remark that fills a line and means nothing at all\n'.repeat(50_000)}`;
    const id = await begin();
    const { body } = await put(id, text).expect(200);
    expect(body).toMatchObject({ bytes: text.length, sha256: createHash('sha256').update(text).digest('hex') });
    expect((await check(id).expect(200)).body.ok).toBe(true);
  });
});

describe('bad input', () => {
  const cases: [string, (line: string, index: number) => string | null, Partial<ImportMapping>, string | RegExp][] = [
    ['NaN in a row', (line, index) => (index === 3 ? line.replace(/,.*/, ',NaN') : line), {}, 'the value is NaN'],
    ['a value missing', (line, index) => (index === 3 ? line.replace(/,.*/, ',') : line), {}, 'the value is empty'],
    [
      'a column missing',
      (line, index) => (index === 3 ? (line.split(',')[0] ?? '') : line),
      {},
      'the row has 1 columns, the mapping needs 2',
    ],
    [
      'two ways of writing time',
      (line, index) => (index === 3 ? `1928866000,${line.split(',')[1] ?? ''}` : line),
      {},
      'all rows must be written in one way',
    ],
    ['an instant twice', (line, index) => (index === 3 ? `${line}\n${line}` : line), {}, 'comes twice'],
    ['time that goes back', (line, index) => (index === 3 ? `2031-02-14T20:00:00Z,1` : line), {}, 'the time goes back'],
    ['a value no pendulum reaches', (line, index) => (index === 3 ? line.replace(/,.*/, ',90000') : line), {}, 'is the unit right?'],
    ['a wrong column in the mapping', (line) => line, { valueColumn: 7 }, 'the mapping names column 8, but the file has 2 columns'],
    ['the wrong unit', (line) => line, { unit: 'rad' }, 'the pendulum can move 0.06 rad at most'],
    ['the wrong time format', (line) => line, { timeFormat: 'epoch-s' }, 'is written as a date, but the mapping says seconds since 1970'],
    [
      'data of another night',
      (line) => line.replace('2031-02-14', '2031-02-12'),
      {},
      /the data end 48 h before the run began: are time format, zone and start of the mapping right\?/,
    ],
  ];

  test.each(cases)('%s is found by row, and nothing is stored', async (...[, change, how, words]) => {
    const id = await sent(deflection(change));
    const checked = (await check(id, how, 'spoilt').expect(200)).body;
    expect(checked.ok).toBe(false);
    expect(checked.problems[0].message).toMatch(words);
    const refused = await commit(id, 'spoilt', how).expect(422);
    expect(refused.body).toMatchObject({ code: 'unreadable-data', detail: expect.stringMatching(/^Nothing was stored/) });
    expect(refused.body.errors[0].message).toMatch(words);
    expect(await samplesOf('spoilt')).toBe(0);
    expect(
      (await lab.as('viewer', 'GET', `${labPath}/rigs/${demoIds.rig}/channels`)).body.items.map(({ name }: { name: string }) => name),
    ).not.toContain('spoilt');
    expect((await check(id, how, 'spoilt')).body.ok).toBe(false);
  });

  test('a problem in the last of many rows leaves the channel as it was', async () => {
    const long = `time_utc,deflection_urad\n${Array.from({ length: 30_000 }, (_, index) => `${new Date(startUtcMs + 5 * index).toISOString()},1`).join('\n')}\nlast,1\n`;
    await commit(await sent(long), 'long').expect(422);
    expect(await samplesOf('long')).toBe(0);
  });

  test('a mapping that contradicts itself is refused before the file is read', async () => {
    const id = await sent(deflection());
    expect((await check(id, { timeFormat: 'elapsed-s' }).expect(400)).body.errors[0].path).toBe('mapping.elapsedFrom');
    expect((await check(id, { valueColumn: 0 }).expect(400)).body.errors[0].path).toBe('mapping.valueColumn');
    expect((await check(id, { decimal: ',' }).expect(400)).body.errors[0].path).toBe('mapping.decimal');
  });

  test('what is no table is refused and says so', async () => {
    const id = await begin('photo.csv');
    const answer = await put(id, Buffer.from([0x89, 0x50, 0x4e, 0x47, 0, 0, 0])).expect(422);
    expect(answer.body).toMatchObject({ code: 'unreadable-data', detail: expect.stringContaining('photo.csv: The file is not text') });
    expect((await check(id).expect(409)).body.detail).toContain('has not arrived');
    await put(id, deflection()).expect(200);
  });

  test('too large, of another type, or encoded', async () => {
    const id = await begin();
    expect((await put(id, 'x'.repeat(4_194_305)).expect(413)).body.detail).toContain('larger than 4 MiB');
    expect((await put(id, '{}', 'application/json').expect(415)).body.code).toBe('wrong-content-type');
    expect((await put(id, 'x').set('Content-Encoding', 'gzip').expect(415)).body.code).toBe('wrong-content-type');
    expect((await put(id, '').expect(422)).body.detail).toContain('The file is empty');
  });

  test('a stream without a length is cut off at the limit', async () => {
    const id = await begin();
    const address = await lab.built.listen();
    const flood = new ReadableStream<Uint8Array>({
      pull: (controller) => controller.enqueue(Buffer.from('2031-02-14T21:00:00Z,1\n'.repeat(5000))),
    });
    const response = await fetch(`${address}/api${labPath}/imports/${id}/content`, {
      method: 'PUT',
      body: flood,
      duplex: 'half',
      headers: { 'content-type': 'text/csv', cookie: lab.cookie('analyst'), origin: address },
    } as RequestInit).catch((error: Error) => error);
    if (response instanceof Response) expect(response.status).toBe(413);
    const pieces = await database().connection.pool.query('select 1 from import_pieces where import_id = $1', [id]);
    expect(pieces.rowCount).toBe(0);
  });
});

describe('samples for a plot', () => {
  test('keep the least and the greatest of each part, and every sample where there are few', async () => {
    const spike = deflection((line, index) => (index === 11 ? line.replace(/,.*/, ',777') : line));
    const stored = await commit(await sent(spike), 'spiked').expect(200);
    const channelId = stored.body.channel.id as string;
    const ask = (query: string) => lab.as('viewer', 'GET', `${labPath}/runs/${runId}/samples?channelId=${channelId}${query}`).expect(200);
    const thinned = (await ask('&points=20')).body;
    expect(thinned.utcMs.length).toBeLessThanOrEqual(20);
    expect(Math.max(...thinned.value)).toBe(777);
    expect(thinned.utcMs[thinned.value.indexOf(777)]).toBe(startUtcMs + 22_000);
    expect([...thinned.utcMs].sort((a: number, b: number) => a - b)).toEqual(thinned.utcMs);
    const near = (await ask(`&points=20&fromUtcMs=${String(startUtcMs + 18_000)}&toUtcMs=${String(startUtcMs + 26_000)}`)).body;
    expect(near.value).toHaveLength(5);
    expect(near.value[2]).toBe(777);
    await lab.as('viewer', 'GET', `${labPath}/runs/${runId}/samples?fromUtcMs=5&toUtcMs=4`).expect(400);
    await lab.as('viewer', 'GET', `${labPath}/runs/${runId}/samples?points=4001`).expect(400);
  });

  test('without a choice are those of the deflection that the rig recorded', async () => {
    // They are stored every half a minute here.
    await lab.advance(31_000);
    const { body } = await lab.as('viewer', 'GET', `${labPath}/runs/${runId}/samples`).expect(200);
    expect(body.channel).toMatchObject({ name: 'deflection', source: 'simulated' });
    expect(body.total).toBeGreaterThan(500);
  });
});

describe('every sample as a file', () => {
  test('CSV and lines of JSON hold what is stored, from end to end of the window; another lab’s channel is not found', async () => {
    const channelId = (await commit(await sent(deflection()), 'exported').expect(200)).body.channel.id as string;
    const ask = (file: string) => lab.as('viewer', 'GET', `${labPath}/channels/${channelId}/${file}`);
    const csv = await ask(`samples.csv?fromUtcMs=${String(startUtcMs + 2000)}&toUtcMs=${String(startUtcMs + 6000)}`).expect(200);
    const at = (s: number) => new Date(startUtcMs + 1000 * s).toISOString().replace('Z', '000Z');
    const value = (index: number) => String(Number((100 * Math.sin(index / 40)).toFixed(3)));
    expect(csv.text).toBe(`time_utc,value (urad)\n${[1, 2, 3].map((index) => `${at(2 * index)},${value(index)}\n`).join('')}`);
    expect(csv.headers['content-disposition']).toMatch(/^attachment; filename="evenfall-exported-\d{4}-\d\d-\d\d-[0-9a-f]{8}\.csv"$/);
    const all = await ask('samples.csv').expect(200);
    expect(all.text.split('\n').slice(1)).toEqual(
      deflection()
        .split('\n')
        .slice(1)
        .map((line) => line.replace(/Z,(.*)/, (_, number: string) => `000Z,${String(Number(number))}`)),
    );
    const json = await ask('samples.ndjson').buffer(true).expect(200);
    expect(json.headers['content-type']).toContain('application/x-ndjson');
    expect(json.text.split('\n')[1]).toBe(JSON.stringify({ channel: 'exported', time_utc: at(2), value: Number(value(1)) }));
    await ask('samples.csv?fromUtcMs=5&toUtcMs=4').expect(400);
    await ask('samples.csv?fromUtcMs=1e300').expect(400);
    await lab.as('viewer', 'GET', `${labPath}/channels/00000000-0000-4000-8000-000000000000/samples.csv`).expect(404);
  });
});
