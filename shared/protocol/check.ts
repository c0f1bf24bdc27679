import type { RigDocument } from '../rig/document';
import { conditionFindings } from './check-conditions';
import { type CheckStart, motionFindings } from './check-motion';
import { readDocument } from './check-schema';
import { nestsTooDeep, structureFindings } from './check-structure';
import { greatestStepCount } from './cursor';
import type { ProtocolDocument } from './document';
import { type Finding, withoutRepeats } from './finding';
import { locateJsonError } from './json-position';
import { planTimeline } from './timeline';

/** Characters; a protocol of 10,000 steps written out one by one stays below. */
const greatestTextLength = 2_000_000;

/**
 * Everything for which a protocol is refused on this rig: when a revision is issued, started, planned or rehearsed. Takes anything,
 * half-typed documents too, and never throws. An empty list means that the protocol can be carried out.
 * @param start where and when it begins, if that is known. Without it, the path of a first move that no home step precedes, and how often
 * a repeat until a time goes round, are left to the check at the start.
 */
export function checkProtocol(document: unknown, rig: RigDocument, start?: CheckStart): Finding[] {
  const read = readDocument(document);
  if (read.document === null) return withoutRepeats(read.findings);
  const structure = [...structureFindings(read.document, rig), ...conditionFindings(read.document, rig)];
  const motion = nestsTooDeep(read.document) ? [] : motionFindings(read.document, rig, start);
  const findings = withoutRepeats([...structure, ...motion]);
  return findings.length === 0 && start !== undefined ? planFindings(read.document, rig, start) : findings;
}

/** Of a protocol that has no other fault: does it end, and within 10,000 steps, when it begins then and there? */
function planFindings(document: ProtocolDocument, rig: RigDocument, { angleDeg, utcMs, timeZone = 'UTC' }: CheckStart): Finding[] {
  if (utcMs === undefined) return [];
  const plan = planTimeline({ protocol: document, rig, timeZone }, { utcMs, angleDeg: angleDeg ?? rig.motion?.homeDeg ?? 0 });
  if (!plan.truncated) return [];
  const counts = new Map<string, number>();
  for (const { documentPath } of plan.items) {
    const path = documentPath.split('.', 2).join('.');
    counts.set(path, (counts.get(path) ?? 0) + 1);
  }
  const [path = null] = [...counts].sort((a, b) => b[1] - a[1])[0] ?? [];
  const message = `Begun at this time the protocol would execute more than ${greatestStepCount.toLocaleString('en-GB')} steps, which is the most that is accepted. Let each pass here take longer, or give atMost.`;
  return [{ code: 'too-many-steps', path, message }];
}

/**
 * Reads the text of a protocol file. `document` is null where it cannot be used; the findings then give line and column of what
 * is no JSON, or the paths of what does not fit the format. Does not need a rig.
 */
export function checkDocumentText(text: string): { document: ProtocolDocument | null; findings: Finding[] } {
  const parsed = parseJson(text);
  return 'finding' in parsed ? { document: null, findings: [parsed.finding] } : readDocument(parsed.value);
}

/** Parses JSON (a byte order mark is passed over); what is no JSON gives a finding with line and column instead of an exception. */
export function parseJson(text: string): { value: unknown } | { finding: Finding } {
  if (text.length > greatestTextLength) {
    return {
      finding: {
        code: 'too-large',
        path: null,
        message: `The text has ${text.length} characters. At most ${greatestTextLength} are read.`,
      },
    };
  }
  const plain = text.startsWith('\uFEFF') ? text.slice(1) : text;
  const error = locateJsonError(plain);
  if (error !== null)
    return { finding: { code: 'not-json', path: null, message: `Line ${error.line}, column ${error.column}: ${error.message}` } };
  return { value: JSON.parse(plain) };
}
