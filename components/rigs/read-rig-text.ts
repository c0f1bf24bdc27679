import { parseJson } from '@/shared/protocol/check';
import { rigDocumentSchema, type RigDocument } from '@/shared/rig/document';

export interface TextProblem {
  path: string;
  message: string;
}

/** A rig document from the text of a file: the document, or everything that keeps it from being one, each with its place. */
export function readRigText(text: string): { document: RigDocument; problems: [] } | { document: null; problems: TextProblem[] } {
  const parsed = parseJson(text);
  if ('finding' in parsed) return { document: null, problems: [{ path: '', message: parsed.finding.message }] };
  return readRigDocument(parsed.value);
}

/** The same for a value that was JSON already. */
export function readRigDocument(value: unknown): { document: RigDocument; problems: [] } | { document: null; problems: TextProblem[] } {
  const read = rigDocumentSchema.safeParse(value);
  if (read.success) return { document: read.data, problems: [] };
  return {
    document: null,
    problems: read.error.issues.map((issue) => ({ path: issue.path.map(String).join('.'), message: issue.message })),
  };
}
