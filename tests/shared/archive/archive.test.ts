import { createHash } from 'node:crypto';
import { archivedData, buildArchive } from '@/shared/archive/build-archive';
import { appendEvent } from '@/shared/archive/chain';
import { readArchive } from '@/shared/archive/read-archive';
import { sha256Hex } from '@/server/evaluation/sha256';
import { smallArchiveInput } from '../../support/small-archive';

const text = (bytes: Uint8Array | undefined) => new TextDecoder().decode(bytes);
const json = (bytes: Uint8Array | undefined) => JSON.parse(text(bytes)) as Record<string, unknown>;

type Files = Map<string, Uint8Array | string>;

/** The small archive with one file changed, hashes of the package kept up to date or not. */
function changed(path: string, change: (content: string) => string, rehash = false): Files {
  const files: Files = new Map(buildArchive(smallArchiveInput(), sha256Hex));
  files.set(path, change(text(files.get(path) as Uint8Array)));
  if (rehash) {
    const descriptor = json(files.get('datapackage.json') as Uint8Array) as { resources: { path: string; bytes: number; hash: string }[] };
    for (const resource of descriptor.resources) {
      const content = Buffer.from(files.get(resource.path) as Uint8Array);
      resource.bytes = content.length;
      resource.hash = `sha256:${createHash('sha256').update(content).digest('hex')}`;
    }
    files.set('datapackage.json', JSON.stringify(descriptor));
  }
  return files;
}

/** Without hashes and without the chain, so that only the content itself can be wrong. */
function bare(path: string, content: string): Files {
  const files: Files = new Map(buildArchive(smallArchiveInput(), sha256Hex));
  for (const gone of ['events.jsonl', 'run.json']) files.delete(gone);
  const descriptor = json(files.get('datapackage.json') as Uint8Array) as { resources: { path: string; bytes?: number; hash?: string }[] };
  descriptor.resources = descriptor.resources.filter((resource) => files.has(resource.path));
  for (const resource of descriptor.resources) {
    delete resource.bytes;
    delete resource.hash;
  }
  files.set('datapackage.json', JSON.stringify(descriptor));
  files.set(path, content);
  return files;
}

const read = (files: Files) => readArchive(files, sha256Hex);

describe('an archive written by Evenfall', () => {
  const input = smallArchiveInput();
  const files = buildArchive(input, sha256Hex);
  const archive = read(files);

  test('is read back without a warning and with every record as it was', () => {
    expect(archive.warnings).toEqual([]);
    expect(archive.chain).toEqual({ events: 3, valid: true });
    expect(archive.rig).toEqual(input.rig);
    expect(archive.protocol).toEqual(input.protocol);
    expect(archive.registered).toEqual({ method: 'equilibrium', drift: 'aba' });
    expect(archive.steps).toEqual(input.steps);
    expect(archive.exclusions).toEqual(input.exclusions);
    expect(archive.channels).toEqual(input.channels.map(({ info }) => info));
    expect(archive.readChannel('deflection')).toEqual(input.channels[0]);
    expect(archive.readChannel('box temperature').value).toEqual(Float64Array.of(21.5));
  });

  test('lists each file with its size and its SHA-256', () => {
    const { resources } = json(files.get('datapackage.json')) as { resources: { path: string; bytes: number; hash: string }[] };
    expect(resources.map(({ path }) => path).sort()).toEqual([...files.keys()].filter((path) => path !== 'datapackage.json').sort());
    for (const { path, bytes, hash } of resources) {
      expect(bytes).toBe(files.get(path)?.length);
      expect(hash).toBe(
        `sha256:${createHash('sha256')
          .update(files.get(path) as Uint8Array)
          .digest('hex')}`,
      );
    }
  });

  test('says in datapackage.json what it is and what each channel measures', () => {
    const descriptor = json(files.get('datapackage.json'));
    expect(descriptor).toMatchObject({
      created: '2026-03-02T08:00:00.000Z',
      evenfall: { formatVersion: 1, runId: '01J0RUN', software: 'Evenfall 0.1.0' },
    });
    expect(descriptor.name).toMatch(/^[a-z0-9._-]+$/);
    const resources = descriptor.resources as Record<string, unknown>[];
    expect(resources.find(({ path }) => path === 'channels/deflection.csv')).toMatchObject({
      evenfall: { quantity: 'angle', unit: 'rad', role: 'deflection' },
    });
  });

  test('describes every column of every CSV in a Table Schema', () => {
    const resources = json(files.get('datapackage.json')).resources as {
      path: string;
      schema?: { fields: { name: string; description: string }[] };
    }[];
    for (const { path, schema } of resources.filter((resource) => resource.path.endsWith('.csv'))) {
      const header = text(files.get(path)).split('\n')[0];
      expect(schema?.fields.map(({ name }) => name).join(',')).toBe(header);
      expect(schema?.fields.every(({ description }) => description.length > 0)).toBe(true);
    }
  });

  test('has the columns of the format in their order, times in UTC and formulas made harmless', () => {
    const [header, , second] = text(files.get('steps.csv')).split('\n');
    expect(header).toBe(
      'seq,path,kind,label,station,planned_start_utc,planned_end_utc,start_utc,end_utc,u_start_s,u_end_s,angle_start_deg,angle_end_deg,outcome,angle_source,u_angle_deg,good',
    );
    expect(second).toBe(
      `2,2.dwell,dwell,"'=SUM(A1), ""quoted""",near,2026-03-01T22:03:20.000000Z,2026-03-01T22:04:50.000000Z,2026-03-01T22:03:20.000125Z,2026-03-01T22:04:50.000500Z,0.001,0.001,20.18,20.18,done,counted,0.01,true`,
    );
  });

  test('closes the chain with the hashes of rig, protocol, steps and channels, and counts it in run.json', () => {
    const lines = text(files.get('events.jsonl')).trim().split('\n');
    const last = JSON.parse(lines.at(-1) as string) as { kind: string; data: { files: Record<string, string> }; hash: string };
    expect(last.kind).toBe('archived');
    expect(Object.keys(last.data.files).sort()).toEqual([
      'channels/box temperature.csv',
      'channels/deflection.csv',
      'protocol.json',
      'rig.json',
      'steps.csv',
    ]);
    expect(last.data.files['steps.csv']).toBe(
      createHash('sha256')
        .update(files.get('steps.csv') as Uint8Array)
        .digest('hex'),
    );
    expect(json(files.get('run.json')).events).toEqual({ count: 3, head: last.hash });
  });

  test('is the same, byte for byte, from the same records', () => {
    expect(buildArchive(smallArchiveInput(), sha256Hex)).toEqual(files);
  });

  test('keeps a closing event that the caller stored itself', () => {
    const closing = appendEvent(
      input.events.at(-1) as never,
      { at: '2026-03-02T07:00:00.000Z', kind: 'archived', data: archivedData(input, sha256Hex) },
      sha256Hex,
    );
    const again = buildArchive({ ...input, events: [...input.events, closing] }, sha256Hex);
    expect(read(again).chain.events).toBe(3);
    expect(read(again).warnings).toEqual([]);
  });
});

describe('a changed archive is refused with the place', () => {
  test.each([
    ['rig.json', (s: string) => s.replace('1.6', '1.7'), /^rig\.json: the SHA-256/],
    ['steps.csv', (s: string) => s.replace('20.18,20.18', '20.18,20.19'), /^steps\.csv: the SHA-256/],
    [
      'channels/deflection.csv',
      (s: string) => s.replace('0.0015', '0.00151'),
      /^channels\/deflection\.csv: the file has \d+ bytes, datapackage\.json says \d+/,
    ],
    ['events.jsonl', (s: string) => s.replace('Wren', 'Vera'), /^events\.jsonl: the SHA-256/],
  ])('%s without its new hash', (path, change, message) => {
    expect(() => read(changed(path, change))).toThrow(message);
  });

  test.each([
    ['events.jsonl', (s: string) => s.replace('Wren Alder', 'Vera Alder'), /^events\.jsonl, row 1: the chain is broken at seq 1/],
    ['events.jsonl', (s: string) => s.split('\n').slice(0, 2).join('\n'), /^run\.json: events\.count is 3, but events\.jsonl holds 2/],
    ['run.json', (s: string) => s.replace(/"head": "./, '"head": "x'), /^run\.json: events\.head is not the hash of the last event, seq 3/],
    [
      'steps.csv',
      (s: string) => s.replace('20.18,20.18', '20.18,20.19'),
      /^steps\.csv: the file is not the one that was archived: event seq 3/,
    ],
    ['rig.json', (s: string) => s.replace('1.6', '1.7'), /^rig\.json: the file is not the one that was archived/],
  ])('%s with every hash of the package made anew', (path, change, message) => {
    expect(() => read(changed(path, change, true))).toThrow(message);
  });

  test('a listed file that is missing is named', () => {
    const files: Files = new Map(buildArchive(smallArchiveInput(), sha256Hex));
    files.delete('exclusions.csv');
    expect(() => read(files)).toThrow('exclusions.csv: listed in datapackage.json but missing');
  });

  test('a chain taken out is missed by run.json', () => {
    const files = changed('datapackage.json', (s) => {
      const descriptor = JSON.parse(s) as { resources: { path: string }[] };
      return JSON.stringify({ ...descriptor, resources: descriptor.resources.filter(({ path }) => path !== 'events.jsonl') });
    });
    files.delete('events.jsonl');
    expect(() => read(files)).toThrow('events.jsonl: the file is missing, although run.json counts 3 events');
  });
});

describe('an archive of less than everything', () => {
  test('is read with a warning for each thing that cannot be told', () => {
    const archive = read(bare('protocol.json', '{"formatVersion": 1, "name": "x", "steps": [{"kind": "home"}]}'));
    expect(archive.chain).toEqual({ events: 0, valid: null });
    expect(archive.registered).toBeNull();
    expect(archive.warnings.map(({ code }) => code).sort()).toEqual(['no-chain', 'no-hashes']);
  });

  test('warns of a chain that is not closed', () => {
    const files: Files = new Map(buildArchive(smallArchiveInput(), sha256Hex));
    const open = text(files.get('events.jsonl') as Uint8Array)
      .split('\n')
      .slice(0, 2)
      .join('\n');
    const rest = bare('events.jsonl', `${open}\n`);
    expect(
      read(rest)
        .warnings.map(({ code }) => code)
        .sort(),
    ).toEqual(['no-archived-event', 'no-hashes']);
  });

  test('needs neither protocol nor run.json nor exclusions', () => {
    const files = bare('rig.json', JSON.stringify(smallArchiveInput().rig));
    for (const path of ['protocol.json', 'exclusions.csv']) files.delete(path);
    const descriptor = JSON.parse(files.get('datapackage.json') as string) as { resources: { path: string }[] };
    files.set('datapackage.json', JSON.stringify({ resources: descriptor.resources.filter(({ path }) => files.has(path)) }));
    expect(read(files).steps).toHaveLength(3);
  });
});

describe('bad content is refused with file, row and column', () => {
  const header = text(buildArchive(smallArchiveInput(), sha256Hex).get('steps.csv')).split('\n')[0] as string;
  const row = '1,1.dwell,dwell,,near,,,2026-03-01T22:00:00.000Z,2026-03-01T22:10:00.000Z,0,0,20.18,20.18,done,,,';
  const steps = (...rows: string[]) => bare('steps.csv', [header, ...rows, ''].join('\n'));

  test('a plain row of only what is known is read', () => {
    expect(read(steps(row)).steps[0]).toMatchObject({ seq: 1, angleEndDeg: 20.18, angleSource: 'counted', good: null });
  });

  test.each([
    [
      'a time without Z',
      steps(row, row.replace('22:10:00.000Z', '22:10:00.000').replace('1,1', '2,2')),
      'steps.csv, row 3, column end_utc: "2026-03-01T22:10:00.000" is not a UTC time',
    ],
    [
      'an end before the start',
      steps(row.replace('22:10:00', '21:10:00')),
      'steps.csv, row 2, column end_utc: the step ends before it starts',
    ],
    [
      'an angle that is no number',
      steps(row.replace('20.18,done', 'NaN,done')),
      'steps.csv, row 2, column angle_end_deg: "NaN" is not a number',
    ],
    ['an unknown kind', steps(row.replace(',dwell,', ',nap,')), 'steps.csv, row 2, column kind: "nap" is none of home, swing, dwell'],
    ['an unknown outcome', steps(row.replace('done', 'fine')), 'steps.csv, row 2, column outcome: "fine" is none of done'],
    ['a number that comes twice', steps(row, row), 'steps.csv, row 3, column seq: 1 does not come after 1'],
    ['a row that is too short', steps('1,1.dwell,dwell'), 'steps.csv, row 2: the row has 3 cells, the header 17'],
    ['a missing column', bare('steps.csv', 'seq,kind\n1,dwell\n'), 'steps.csv, row 1: the columns path, label,'],
    ['an empty step log', bare('steps.csv', ''), 'steps.csv: the file is empty'],
    ['a broken quote', steps('1,"1.dwell,dwell'), 'steps.csv, row 2: not readable as CSV'],
    [
      'a stretch without an end',
      bare('exclusions.csv', 'start_utc,end_utc,reason\n2026-03-01T22:00:00.000Z,,x\n'),
      'exclusions.csv, row 2, column end_utc: "" is not a UTC time',
    ],
    ['a rig that is not JSON', bare('rig.json', '{'), 'rig.json: not readable as JSON'],
    [
      'a quantity in another unit',
      bare('rig.json', JSON.stringify(smallArchiveInput().rig).replace('"kg"', '"g"')),
      /^rig\.json: .*ballMass\.unit|^rig\.json: .*unit/,
    ],
    [
      'a missing quantity',
      bare('rig.json', '{"pendulum": {}, "sources": {"shape": "sphere"}, "stations": {}}'),
      /^rig\.json: pendulum\.arm/,
    ],
    [
      'a registered method that there is not',
      bare('protocol.json', '{"formatVersion":1,"evaluation":{"method":"guess"}}'),
      /^protocol\.json: evaluation\.method/,
    ],
    ['a package that is not JSON', bare('datapackage.json', 'x'), 'datapackage.json: not readable as JSON'],
    [
      'a package of another format',
      bare('datapackage.json', '{"resources":[],"evenfall":{"formatVersion":2}}'),
      'datapackage.json: evenfall.formatVersion is 2',
    ],
    [
      'a resource outside the archive',
      bare('datapackage.json', '{"resources":[{"path":"../rig.json"}]}'),
      'datapackage.json: the resource path "../rig.json" must be relative',
    ],
  ])('%s', (_what, files, message) => {
    expect(() => read(files)).toThrow(message);
  });

  test.each([
    [
      'a time that goes back',
      '2026-03-01T22:00:01.000Z,1\n2026-03-01T22:00:00.900Z,1\n',
      'channels/deflection.csv, row 3, column time_utc: 2026-03-01T22:00:00.900Z is not later',
    ],
    ['a value that is NaN', '2026-03-01T22:00:01.000Z,NaN\n', 'channels/deflection.csv, row 2, column value: "NaN" is not a number'],
    ['an empty value', '2026-03-01T22:00:01.000Z,\n', 'channels/deflection.csv, row 2, column value: "" is not a number'],
    ['a decimal comma', '2026-03-01T22:00:01.000Z,1,5\n', 'channels/deflection.csv, row 2, column value: "1,5" is not a number'],
    ['a time of another kind', '1772402400,1\n', 'channels/deflection.csv, row 2, column time_utc: "1772402400" is not a UTC time'],
    ['half a row', '2026-03-01T22:00:01.000Z\n', 'channels/deflection.csv, row 2: "2026-03-01T22:00:01.000Z" is not a time and a value'],
  ])('%s', (_what, rows, message) => {
    const files = bare('channels/deflection.csv', `time_utc,value\n${rows}`);
    expect(() => read(files).readChannel('deflection')).toThrow(message);
  });

  test('a channel is read the same with quotes, with line ends of another system and with columns changed over', () => {
    const plain = 'time_utc,value\n2026-03-01T22:00:01.000Z,1.5\n2026-03-01T22:00:02.000Z,-2\n';
    const expected = read(bare('channels/deflection.csv', plain)).readChannel('deflection');
    for (const other of [
      plain.replaceAll('\n', '\r\n'),
      plain.replaceAll('1.5', '"1.5"'),
      `\uFEFF${plain}`,
      'value,time_utc\n1.5,2026-03-01T22:00:01.000Z\n-2,2026-03-01T22:00:02.000Z\n',
    ]) {
      expect(read(bare('channels/deflection.csv', other)).readChannel('deflection')).toEqual(expected);
    }
  });

  test('a channel that there is not is answered with those that there are', () => {
    const archive = read(buildArchive(smallArchiveInput(), sha256Hex));
    expect(() => archive.readChannel('tilt')).toThrow('there is no channel "tilt"; the archive holds "deflection", "box temperature"');
  });
});
