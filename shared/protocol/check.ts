import type { RigDocument } from '../rig/document';
import { motionFindings } from './check-motion';
import { readDocument } from './check-schema';
import { nestsTooDeep, structureFindings } from './check-structure';
import type { ProtocolDocument } from './document';
import { type Finding, withoutRepeats } from './finding';
import { locateJsonError } from './json-position';
import { notYet } from './support';

/** Characters; a protocol of 10,000 steps written out one by one stays below. */
const greatestTextLength = 2_000_000;

/**
 * Everything for which a protocol is refused on this rig: when a revision is issued, started, planned or rehearsed. Takes anything,
 * half-typed documents too, and never throws. An empty list means that the protocol can be carried out.
 * @param start where the sources stand at the start (deg), if that is known; without it the first motion must follow a home step.
 */
export function checkProtocol(document: unknown, rig: RigDocument, start?: { angleDeg: number }): Finding[] {
  const read = readDocument(document);
  if (read.document === null) return withoutRepeats(read.findings);
  const structure = [...structureFindings(read.document, rig), ...notYet(read.document)];
  const motion = nestsTooDeep(read.document) ? [] : motionFindings(read.document, rig, start?.angleDeg ?? null);
  return withoutRepeats([...structure, ...motion]);
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
