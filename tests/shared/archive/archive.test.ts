import { createHash } from 'node:crypto';
import { archivedData, buildArchive } from '@/shared/archive/build-archive';
import { appendEvent } from '@/shared/archive/chain';
import { sha256Hex } from '@/server/evaluation/sha256';
import { bare, changed, json, read, text, type Files } from '../../support/changed-archive';
import { smallArchiveInput } from '../../support/small-archive';

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
      `2,2.dwell,dwell,"'=SUM(A1), ""quoted""",near,2026-03-01T22:03:20.000000Z,2026-03-01T22:04:50.000000Z,2026-03-01T22:03:20.000125Z,2026-03-01T22:04:50.000500Z,0.001,0.001,20.18,20.18,done,edge-verified,0.01,true`,
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
    ['events.jsonl', (s: string) => s.replace('Wren', 'Vera'), /^events\.jsonl, row 1: the chain is broken at seq 1: event 1 was changed/],
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
