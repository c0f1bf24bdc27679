import { createHash } from 'node:crypto';
import { buildArchive } from '@/shared/archive/build-archive';
import { sha256Hex } from '@/server/evaluation/sha256';
import { json, read, text } from '../../support/changed-archive';
import { smallArchiveInput } from '../../support/small-archive';

const input = smallArchiveInput();
const files = buildArchive(input, sha256Hex);

interface Entity {
  '@id': string;
  '@type': string;
  [key: string]: unknown;
}
const graph = (json(files.get('ro-crate-metadata.json')) as unknown as { '@graph': Entity[] })['@graph'];
const entity = (id: string) => graph.find((one) => one['@id'] === id);
const ids = (refs: unknown) => (refs as { '@id': string }[]).map((one) => one['@id']);

describe('RO-Crate 1.2', () => {
  test('the descriptor is about the root, which has name, description, date and licence as the specification requires', () => {
    expect(entity('ro-crate-metadata.json')).toMatchObject({
      '@type': 'CreativeWork',
      conformsTo: { '@id': 'https://w3id.org/ro/crate/1.2' },
      about: { '@id': './' },
    });
    const root = entity('./');
    expect(root).toMatchObject({ '@type': 'Dataset', name: expect.any(String) as string, description: expect.any(String) as string });
    expect(root?.datePublished).toBe(input.createdAt);
    expect(entity((root?.license as { '@id': string })['@id'])?.name).toBe('No licence stated');
  });

  test('every file is part of the crate, with the size and the SHA-256 that it has', () => {
    const others = [...files.keys()].filter((path) => path !== 'ro-crate-metadata.json');
    expect(ids(entity('./')?.hasPart).map(decodeURI).sort()).toEqual(others.sort());
    for (const path of others.filter((one) => one !== 'datapackage.json')) {
      const bytes = files.get(path) as Uint8Array;
      expect(entity(encodeURI(path))).toMatchObject({
        '@type': 'File',
        contentSize: String(bytes.length),
        sha256: createHash('sha256').update(bytes).digest('hex'),
      });
    }
  });

  test('the run made the files, with a person and a program, and every reference leads to an entity', () => {
    const run = entity('#run');
    expect(run?.['@type']).toBe('CreateAction');
    expect(ids(run?.result)).toContain('steps.csv');
    expect(entity('#operator')?.name).toBe(input.run.operator);
    expect(entity('#software')?.name).toBe(input.software);
    const known = new Set(graph.map((one) => one['@id']));
    const refs = [...JSON.stringify(graph).matchAll(/\{"@id":"([^"]*)"\}/g)].map(([, id]) => id as string);
    expect(refs.filter((id) => !known.has(id) && !id.startsWith('https://'))).toEqual([]);
    expect(known.size).toBe(graph.length);
  });
});

test('CITATION.cff has the keys that its format requires, whatever the title holds', () => {
  const odd = buildArchive({ ...input, title: 'Night: "far" # 3\nand more' }, sha256Hex);
  const lines = text(odd.get('CITATION.cff')).split('\n');
  expect(lines).toEqual(expect.arrayContaining(['cff-version: 1.2.0', 'type: dataset', 'authors:', `  - name: "${input.run.operator}"`]));
  expect(lines.some((line) => line.startsWith('message: "'))).toBe(true);
  expect(lines).toContain(String.raw`title: "Night: \"far\" # 3\nand more"`);
  expect(read(odd).warnings).toEqual([]);
});

describe('with a frozen evaluation', () => {
  const G = { value: 6.6752e-11, u: 2.7e-13, degreesOfFreedom: 30 };
  const frozen = {
    at: '2026-03-02T07:00:00.000Z',
    by: 'Tam Ferrowdale',
    reason: 'for the thesis',
    software: '0.1.0',
    channel: 'deflection',
  };
  const evaluation = { G, frozen } as unknown as NonNullable<typeof input.evaluation>;
  const held = buildArchive({ ...input, evaluation }, sha256Hex);
  const entities = (json(held.get('ro-crate-metadata.json')) as unknown as { '@graph': Entity[] })['@graph'];
  const found = (id: string) => entities.find((one) => one['@id'] === id);

  test('the crate tells of the evaluation as an action from the files of the run to evaluation.json, with person and program', () => {
    const action = found('#evaluation');
    expect(action).toMatchObject({ '@type': 'CreateAction', endTime: frozen.at, result: { '@id': 'evaluation.json' } });
    expect(ids(action?.object)).toEqual(expect.arrayContaining(['rig.json', 'steps.csv', 'channels/deflection.csv']));
    expect(ids(action?.object)).not.toContain('evaluation.json');
    expect(ids(found('#run')?.result)).not.toContain('evaluation.json');
    expect(found('#evaluator')?.name).toBe('Tam Ferrowdale');
    expect(found('#evaluation-software')?.name).toBe('Evenfall 0.1.0');
    expect(String(action?.description)).toContain('for the thesis');
  });

  test('the citation and the text for people tell G with its uncertainty and unit', () => {
    for (const path of ['CITATION.cff', 'README.md'])
      expect(text(held.get(path)).replaceAll('\u202f', ' ')).toContain('G = 6.675(27) × 10⁻¹¹ m³ kg⁻¹ s⁻²');
    expect(text(files.get('README.md'))).toContain('no frozen evaluation');
  });
});
