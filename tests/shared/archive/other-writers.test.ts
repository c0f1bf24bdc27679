import { createHash } from 'node:crypto';
import { buildArchive } from '@/shared/archive/build-archive';
import { sha256Hex } from '@/server/evaluation/sha256';
import { bare, changed, json, read, text, type Files } from '../../support/changed-archive';
import { smallArchiveInput } from '../../support/small-archive';

type Json = Record<string, unknown>;

const codes = (files: Files) => read(files).warnings.map(({ code }) => code);
const hashOf = (content: Uint8Array | string) => createHash('sha256').update(content).digest('hex');
const canonical = (value: unknown): string =>
  typeof value === 'object' && value !== null
    ? `{${Object.entries(value)
        .sort(([a], [b]) => (a < b ? -1 : 1))
        .map(([key, one]) => `${JSON.stringify(key)}:${canonical(one)}`)
        .join(',')}}`
    : JSON.stringify(value);

describe('a rig that another writer described', () => {
  const withRig = (change: (rig: Record<string, Json>) => void) => {
    const rig = structuredClone(smallArchiveInput().rig) as unknown as Record<string, Json>;
    change(rig);
    return bare('rig.json', JSON.stringify(rig));
  };

  test.each([
    ['no motion', (rig: Record<string, Json>) => void delete rig.motion],
    ['a motion of which only a part is known', (rig: Record<string, Json>) => void (rig.motion = { minDeg: -175 })],
  ])('with %s is read: motion is needed to run, never to evaluate', (_what, change) => {
    const files = withRig(change);
    expect(read(files).rig.motion).toBeUndefined();
    expect(codes(files)).toEqual(['no-chain', 'no-hashes']);
  });

  test('with keys that this version does not know is read without them, and says which', () => {
    const archive = read(
      withRig((rig) => {
        rig.label = {};
        Object.assign(rig.sources as Json, { ofset: 1 });
      }),
    );
    expect(archive.rig).not.toHaveProperty('label');
    expect(archive.warnings.find(({ code }) => code === 'rig-unknown-key')?.message).toContain('label');
    expect(archive.warnings.find(({ code }) => code === 'rig-unknown-key')?.message).toContain('sources.ofset');
  });

  test.each([
    ['pendulum.arm', 0, 'rig.json: pendulum.arm is 0 m; a positive value is needed'],
    ['sources.mass', -1.6, 'rig.json: sources.mass is -1.6 kg; a positive value is needed'],
    ['pendulum.beamMass', -0.004, 'rig.json: pendulum.beamMass is -0.004 kg; zero or a positive value is needed'],
  ])('whose %s is %d is refused', (path, value, message) => {
    const [part, key] = path.split('.') as [string, string];
    const files = withRig((rig) => Object.assign((rig[part] as Record<string, Json>)[key] as Json, { value }));
    expect(() => read(files)).toThrow(message);
  });

  test('whose measured period is negative is refused', () => {
    const files = withRig((rig) => void (rig.measured = { period_s: { value: -420, u: 0.1, unit: 's' } }));
    expect(() => read(files)).toThrow('rig.json: measured.period_s is -420 s; a positive value is needed');
  });
});

describe('channels beside the deflection', () => {
  const describedAs = (facts: unknown) =>
    bare(
      'datapackage.json',
      JSON.stringify({
        resources: [
          { path: 'channels/deflection.csv', evenfall: { quantity: 'angle', unit: 'rad', role: 'deflection' } },
          { path: 'channels/box temperature.csv', evenfall: facts },
        ],
        evenfall: { software: 'by hand' },
      }),
    );

  test.each([[{ quantity: 'temperature', unit: 'Cel', role: 'thermometer' }], [{ quantity: 'temperature' }], [{}], [null], ['later']])(
    'may be described as %j',
    (facts) => {
      expect(read(describedAs(facts)).channels.map(({ name }) => name)).toEqual(['deflection', 'box temperature']);
    },
  );

  test('a deflection without a unit is refused', () => {
    const files = describedAs({ role: 'deflection' });
    expect(() => read(files)).toThrow(
      'datapackage.json: the resource channels/box temperature.csv must say evenfall: {quantity, unit, role}',
    );
  });
});

describe('hashes', () => {
  const hashed = (change: (hash: string) => string) =>
    changed('datapackage.json', (s) => {
      const descriptor = JSON.parse(s) as { resources: { path: string; hash: string }[] };
      for (const one of descriptor.resources) if (one.path === 'steps.csv') one.hash = change(one.hash);
      return JSON.stringify(descriptor);
    });

  test.each([
    ['in capitals', (hash: string) => hash.toUpperCase().replace('SHA256', 'sha256')],
    ['without their kind', (hash: string) => hash.slice('sha256:'.length)],
  ])('%s are held against the file', (_what, change) => {
    expect(codes(hashed(change))).toEqual([]);
    expect(() => read(hashed((hash) => change(hash).replace(/.$/, (digit) => (digit === '0' ? '1' : '0'))))).toThrow(
      /^steps\.csv: the SHA-256/,
    );
  });

  test('a SHA-256 cut short is refused, not passed over', () => {
    expect(() => read(hashed((hash) => hash.slice(0, 20)))).toThrow(/^steps\.csv: its hash in datapackage\.json/);
  });

  test('of another kind cannot be checked', () => {
    expect(codes(hashed(() => 'md5:d41d8cd98f00b204e9800998ecf8427e'))).toEqual(['no-hashes']);
  });

  test('an exclusions.csv that the package does not list is warned of', () => {
    const files: Files = new Map(buildArchive(smallArchiveInput({ exclusions: undefined as never }), sha256Hex));
    files.set('exclusions.csv', 'start_utc,end_utc,reason\n');
    const warning = read(files).warnings.find(({ code }) => code === 'no-hashes');
    expect(warning?.message).toContain('exclusions.csv');
  });
});

describe('the chain', () => {
  const sealed = ['rig.json', 'protocol.json', 'steps.csv', 'channels/deflection.csv', 'channels/box temperature.csv'];

  /** The small archive with a closing event of other data, chained by the rule of the format written anew here. */
  function closedWith(dataOf: (hashes: Record<string, string>) => Json): Files {
    const files: Files = bare('note.txt', '');
    files.delete('note.txt');
    const hashes = Object.fromEntries(sealed.map((path) => [path, hashOf(files.get(path) as Uint8Array)]));
    const event = { seq: 1, at: '2026-03-02T08:00:00.000Z', kind: 'archived', data: dataOf(hashes), prev: '0'.repeat(64) };
    return files.set('events.jsonl', `${JSON.stringify({ ...event, hash: hashOf(canonical(event)) })}\n`);
  }
  const wrong = 'a'.repeat(64);
  const short = (hashes: Record<string, string>, steps = hashes['steps.csv']) => ({
    rig: hashes['rig.json'],
    protocol: hashes['protocol.json'],
    steps,
    channels: { deflection: hashes['channels/deflection.csv'], 'box temperature': hashes['channels/box temperature.csv'] },
  });

  test.each([
    ['paths', (h: Record<string, string>, steps: string) => ({ ...h, 'steps.csv': steps })],
    ['paths under a key', (h: Record<string, string>, steps: string) => ({ sha256: { ...h, 'steps.csv': steps } })],
    ['short names', (h: Record<string, string>, steps: string) => short(h, steps)],
  ])('may seal the files by %s', (_what, dataOf) => {
    expect(codes(closedWith((h) => dataOf(h, h['steps.csv'] as string)))).toEqual(['no-hashes']);
    expect(() => read(closedWith((h) => dataOf(h, wrong)))).toThrow(/^steps\.csv: the file is not the one that was archived: event seq 1/);
  });

  test('that seals nothing, or not everything, is warned of', () => {
    expect(codes(closedWith(() => ({})))).toContain('no-archived-event');
    const warning = read(closedWith((h) => ({ files: { 'rig.json': h['rig.json'] as string } }))).warnings.at(-1);
    expect(warning).toMatchObject({ code: 'no-archived-event', message: expect.stringContaining('steps.csv') as string });
  });

  test('may be counted in run.json without its head', () => {
    const files = closedWith((h) => h);
    expect(read(files.set('run.json', '{"events": {"count": 1}}')).chain.events).toBe(1);
    expect(() => read(files.set('run.json', '{"events": {"count": 2}}'))).toThrow('run.json: events.count is 2');
  });

  test.each([
    ['a key that a parser may drop', '"by":', '"__proto__":{"by":"Vera"},"by":'],
    ['a number beyond all doubles', '"by":', '"size":1e400,"by":'],
  ])('%s in an event is not passed over', (_what, before, after) => {
    const files = changed('events.jsonl', (s) => s.replace(before, after), true);
    expect(files.get('events.jsonl')).toContain(after);
    expect(() => read(files)).toThrow('events.jsonl, row 1: the chain is broken at seq 1');
  });

  test('the small archive names the files that it seals', () => {
    const archive = buildArchive(smallArchiveInput(), sha256Hex);
    const last = text(archive.get('events.jsonl')).trim().split('\n').at(-1) as string;
    expect(Object.keys((JSON.parse(last) as { data: { files: Json } }).data.files).sort()).toEqual([...sealed].sort());
    expect(json(archive.get('run.json')).events).toMatchObject({ count: 3 });
  });
});
