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
  /** The frozen evaluation that the archive holds; null without one. */
  evaluation: DescribedEvaluation | null;
}

export interface DescribedEvaluation {
  /** When it was frozen, ISO 8601 UTC, by whom and why. */
  at: string;
  by: string;
  reason: string;
  /** Version of the software that computed it. */
  software: string | null;
  /** G with its standard uncertainty and unit, in words; null where it gives none. */
  result: string | null;
}

export interface DescribedFile {
  path: string;
  bytes: Uint8Array;
  mediatype: string;
}

const about = (run: DescribedRun) =>
  `Records of one torsion-balance run: rig, protocol, step log, event chain and channels, with all that is needed to compute its result again. Run ${run.runId}.${foundWords(run.evaluation)}`;

function foundWords(evaluation: DescribedEvaluation | null): string {
  if (evaluation?.result == null) return '';
  return ` Frozen evaluation of ${evaluation.at.slice(0, 10)}: G = ${evaluation.result} (standard uncertainty in brackets).`;
}

const ref = (id: string) => ({ '@id': id });

/**
 * `ro-crate-metadata.json` (https://w3id.org/ro/crate/1.2): the run as the `CreateAction` that the files came from, who was responsible, and
 * what wrote them. Each file with its size and SHA-256.
 */
export function crateMetadata(run: DescribedRun, files: readonly DescribedFile[], sha256: Sha256OfBytes): Record<string, unknown> {
  const licence = run.licenses[0];
  const licenceId = licence?.path ?? '#licence';
  const fileIds = files.map(({ path }) => encodeURI(path));
  const { evaluation } = run;
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
        mentions: evaluation === null ? ref('#run') : ['#run', '#evaluation'].map(ref),
      },
      {
        '@id': '#run',
        '@type': 'CreateAction',
        name: run.title,
        instrument: ref('#software'),
        ...(operator === null ? {} : { agent: ref('#operator') }),
        ...(run.startedAt === null ? {} : { startTime: run.startedAt }),
        ...(run.endedAt === null ? {} : { endTime: run.endedAt }),
        result: fileIds.filter((id) => evaluation === null || id !== evaluationFile).map(ref),
      },
      ...(evaluation === null ? [] : evaluationEntities(evaluation, fileIds)),
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

const evaluationFile = 'evaluation.json';

/** The evaluation as an action of its own, from the run's files to `evaluation.json`, with who froze it and what computed it. */
function evaluationEntities({ at, by, reason, software, result }: DescribedEvaluation, fileIds: readonly string[]): object[] {
  return [
    {
      '@id': '#evaluation',
      '@type': 'CreateAction',
      name: 'Frozen evaluation',
      description: [...(result === null ? [] : [`G = ${result}`]), ...(reason === '' ? [] : [`Frozen because: ${reason}`])].join('. '),
      instrument: ref('#evaluation-software'),
      agent: ref('#evaluator'),
      endTime: at,
      object: fileIds.filter((id) => id !== evaluationFile).map(ref),
      result: ref(evaluationFile),
    },
    { '@id': '#evaluation-software', '@type': 'SoftwareApplication', name: `Evenfall ${software ?? 'of a version not kept'}` },
    { '@id': '#evaluator', '@type': 'Person', name: by === '' ? 'not stated' : by },
  ];
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
