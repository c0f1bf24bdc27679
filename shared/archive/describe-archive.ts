import type { Sha256OfBytes } from './archive-types';

/** What other people's tools and readers look for beside the data package: RO-Crate 1.2 metadata and a citation in the Citation File Format 1.2.0. */

export interface DescribedRun {
  runId: string;
  title: string;
  operator: string;
  /** ISO 8601 UTC. */
  createdAt: string;
  startedAt: string | null;
  endedAt: string | null;
  software: string;
  licenses: readonly { name: string; title?: string; path?: string }[];
}

export interface DescribedFile {
  path: string;
  bytes: Uint8Array;
  mediatype: string;
}

const about = (run: DescribedRun) =>
  `Records of one torsion-balance run: rig, protocol, step log, event chain and channels, with all that is needed to compute its result again. Run ${run.runId}.`;

const ref = (id: string) => ({ '@id': id });

/**
 * `ro-crate-metadata.json` (https://w3id.org/ro/crate/1.2): the run as the `CreateAction` that the files came from, who was responsible, and
 * what wrote them. Each file with its size and SHA-256.
 */
export function crateMetadata(run: DescribedRun, files: readonly DescribedFile[], sha256: Sha256OfBytes): Record<string, unknown> {
  const licence = run.licenses[0];
  const licenceId = licence?.path ?? '#licence';
  const fileIds = files.map(({ path }) => encodeURI(path));
  const operator = run.operator === '' ? null : { '@id': '#operator', '@type': 'Person', name: run.operator };
  return {
    '@context': 'https://w3id.org/ro/crate/1.2/context',
    '@graph': [
      {
        '@id': 'ro-crate-metadata.json',
        '@type': 'CreativeWork',
        conformsTo: ref('https://w3id.org/ro/crate/1.2'),
        about: ref('./'),
      },
      {
        '@id': './',
        '@type': 'Dataset',
        name: run.title,
        description: about(run),
        identifier: run.runId,
        datePublished: run.createdAt,
        license: ref(licenceId),
        ...(operator === null ? {} : { author: ref('#operator') }),
        hasPart: [...fileIds, 'datapackage.json'].map(ref),
        mentions: ref('#run'),
      },
      {
        '@id': '#run',
        '@type': 'CreateAction',
        name: run.title,
        instrument: ref('#software'),
        ...(operator === null ? {} : { agent: ref('#operator') }),
        ...(run.startedAt === null ? {} : { startTime: run.startedAt }),
        ...(run.endedAt === null ? {} : { endTime: run.endedAt }),
        result: fileIds.map(ref),
      },
      { '@id': '#software', '@type': 'SoftwareApplication', name: run.software },
      ...(operator === null ? [] : [operator]),
      { '@id': licenceId, '@type': 'CreativeWork', name: licence?.title ?? licence?.name ?? 'No licence stated' },
      ...files.map(({ path, bytes, mediatype }) => ({
        '@id': encodeURI(path),
        '@type': 'File',
        name: path,
        encodingFormat: mediatype,
        contentSize: String(bytes.length),
        sha256: sha256(bytes),
      })),
      { '@id': 'datapackage.json', '@type': 'File', name: 'datapackage.json', encodingFormat: 'application/json' },
    ],
  };
}

/** `CITATION.cff`. Every text is written as a JSON string, which is a double-quoted scalar of YAML 1.2. */
export function citationText(run: DescribedRun): string {
  const text = (value: string) => JSON.stringify(value);
  return [
    'cff-version: 1.2.0',
    'message: "If you use these data, please cite them as below."',
    'type: dataset',
    `title: ${text(run.title)}`,
    'authors:',
    `  - name: ${text(run.operator === '' ? 'not stated' : run.operator)}`,
    `date-released: ${text(run.createdAt.slice(0, 10))}`,
    `abstract: ${text(about(run))}`,
    'identifiers:',
    '  - type: other',
    `    value: ${text(run.runId)}`,
    '    description: "Run of the laboratory that measured it"',
    '',
  ].join('\n');
}
