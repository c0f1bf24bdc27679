import type { Finding } from '../protocol/finding';
import { parseJson } from '../protocol/check';
import { rigDocumentSchema, type RigDocument } from './document';

/**
 * Reads the text of a rig file. `rig` is null where it cannot be used; the findings then give line and column of what is no JSON, or the
 * dotted names of the fields that do not fit (`sources.orbit.unit`).
 */
export function checkRigText(text: string): { rig: RigDocument | null; findings: Finding[] } {
  const parsed = parseJson(text);
  if ('finding' in parsed) return { rig: null, findings: [parsed.finding] };
  const read = rigDocumentSchema.safeParse(parsed.value);
  if (read.success) return { rig: read.data, findings: [] };
  const findings = read.error.issues.map(({ path, message }) => ({
    code: 'invalid-field',
    path: path.length === 0 ? null : path.map(String).join('.'),
    message,
  }));
  return { rig: null, findings };
}
