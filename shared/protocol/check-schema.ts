import type * as z from 'zod';
import { documentFields, protocolDocumentSchema, type ProtocolDocument, stepFields, type StepKind } from './document';
import type { Finding } from './finding';

/** What a field accepts, for the sentence that refuses it. */
const accepted: Record<string, string> = {
  to: 'the name of a station, or {"angle_deg": a number}',
  until:
    '{"localTime": "HH:MM"}; in a wait also {"channel": …, "below" or "slopeBelow_per_h": …}, in a repeat also {"relativeStatisticalU": …}',
  localTime: 'a time of day written HH:MM, for example "22:00"',
  profile: '"plain" or "shaped"',
  kind: Object.keys(stepFields).join(', '),
  steps: 'a list of steps',
  formatVersion: '1',
  ifPast: '"continue", "hold" or "next day"',
  turns: 'a whole number of turns other than 0',
  times: 'a whole number from 1',
  atLeast: 'a whole number from 1',
  atMost: 'a whole number from 1',
  calmWhen: '{"amplitude_urad" or "drift_urad_per_h" or both, "window_s"}',
};

/** The fields of the parts of a document, for the sentence that refuses another one. */
const fieldsInside: Record<string, string> = {
  to: 'angle_deg',
  calmWhen: 'amplitude_urad, drift_urad_per_h, window_s',
  'wait until': 'localTime and ifPast, or channel, below, slopeBelow_per_h and for_s',
  'repeat until': 'localTime or relativeStatisticalU',
  atEnd: 'station, drivers',
  goodWhen: 'residual_urad, channels',
  channels: 'channel, below, above, slopeBelow_per_h',
  evaluation: 'method, drift, order, channel',
};

const greatestDepth = 64;

/** Is the value nested so deeply that reading it is refused (more than 64 levels of JSON)? */
function isTooDeep(value: unknown): boolean {
  let level: unknown[] = [value];
  for (let depth = 0; depth <= greatestDepth; depth += 1) {
    level = level.flatMap((entry) => (typeof entry === 'object' && entry !== null ? Object.values(entry) : []));
    if (level.length === 0) return false;
  }
  return true;
}

/**
 * Reads anything as a protocol document. `document` is null where it does not fit the schema, and the findings say where and what
 * would fit; never throws.
 */
export function readDocument(value: unknown): { document: ProtocolDocument | null; findings: Finding[] } {
  if (isTooDeep(value)) {
    return {
      document: null,
      findings: [
        { code: 'nested-too-deep', path: null, message: 'The document is nested too deeply to be read. Repeats nest at most 4 deep.' },
      ],
    };
  }
  const parsed = protocolDocumentSchema.safeParse(value);
  if (parsed.success) return { document: parsed.data, findings: [] };
  return { document: null, findings: parsed.error.issues.map((issue) => findingOf(issue, value)) };
}

type Issue = z.core.$ZodIssue;

/** Of a field that may take several forms, the issue of the form that fits best. */
function clearest(issue: Issue): Issue {
  if (issue.code !== 'invalid_union' || issue.errors.length === 0) return issue;
  const shallow = (form: Issue[]) => form.some(({ path, code }) => path.length === 0 && code === 'invalid_type');
  const forms = issue.errors.filter((form) => !shallow(form)).sort((a, b) => a.length - b.length);
  const [best, second] = forms;
  const inner = best?.[0];
  if (best === undefined || inner === undefined || (second !== undefined && second.length === best.length)) return issue;
  return clearest({ ...inner, path: [...issue.path, ...inner.path] });
}

function findingOf(raw: Issue, root: unknown): Finding {
  const issue = clearest(raw);
  const place = placeOf(issue.path, root);
  if (issue.code === 'unrecognized_keys') return unknownFields(issue.keys, place);
  if (place.field === 'kind' && place.path !== null) return unknownKind(place);
  return { code: 'invalid-field', path: place.path ?? topField(issue.path), message: fieldMessage(issue, place) };
}

interface Place {
  /** Path of the step; null outside the steps. */
  path: string | null;
  kind: string | null;
  /** Dotted name of the field within the step or the document; empty for the step or document itself. */
  field: string;
  value: unknown;
}

const topField = (path: readonly PropertyKey[]) => (path.length === 0 ? null : String(path[0]));

/** Turns `['steps', 1, 'steps', 0, 'to']` into the step path `2.repeat.1.swing` and the field `to`. */
function placeOf(path: readonly PropertyKey[], root: unknown): Place {
  const parts: string[] = [];
  let kind: string | null = null;
  let value = root;
  let index = 0;
  for (; path[index] === 'steps' && typeof path[index + 1] === 'number'; index += 2) {
    value = child(child(value, 'steps'), path[index + 1] as number);
    const own = child(value, 'kind');
    kind = typeof own === 'string' ? own : null;
    parts.push(kind === null ? String((path[index + 1] as number) + 1) : `${(path[index + 1] as number) + 1}.${kind}`);
  }
  const rest = path.slice(index);
  return {
    path: parts.length === 0 ? null : parts.join('.'),
    kind,
    field: rest.map(String).join('.'),
    value: rest.reduce<unknown>(child, value),
  };
}

function child(value: unknown, key: PropertyKey): unknown {
  return typeof value === 'object' && value !== null && Object.hasOwn(value, key)
    ? (value as Record<PropertyKey, unknown>)[key]
    : undefined;
}

function unknownFields(keys: readonly string[], place: Place): Finding {
  const names = keys.map((key) => `"${key}"`).join(', ');
  const whose = place.path === null ? 'the document' : `a ${place.kind ?? 'step'}`;
  const inField = place.field === '' ? whose : place.field;
  const known = knownFields(place);
  return {
    code: 'unknown-field',
    path: place.path ?? (place.field === '' ? null : (place.field.split('.')[0] ?? null)),
    message: `Unknown field ${names} in ${inField}. ${known === '' ? 'Remove it.' : `Accepted are: ${known}.`}`,
  };
}

function knownFields({ path, kind, field }: Place): string {
  const part = field.split('.').findLast((name) => !/^\d+$/.test(name)) ?? '';
  if (part !== '') return fieldsInside[part] ?? fieldsInside[`${kind ?? ''} ${part}`] ?? '';
  return (path === null ? documentFields : (stepFields[kind as StepKind] ?? [])).join(', ');
}

function unknownKind({ path, value }: Place): Finding {
  const given = value === undefined ? 'The step has no kind' : `There is no step kind ${JSON.stringify(value)}`;
  return { code: 'unknown-kind', path, message: `${given}. Accepted are: ${accepted['kind']}.` };
}

function fieldMessage(issue: Issue, { field, kind, value, path }: Place): string {
  const leaf = field.split('.').at(-1) ?? '';
  if (field === '')
    return issue.code === 'custom' && kind !== null
      ? `A ${kind}: ${issue.message}.`
      : `${path === null ? 'The document' : 'The step'} must be a JSON object.`;
  const given = value === undefined ? `${field} is missing` : `${field} is ${shown(value)}, which is not accepted`;
  return `${given}. It takes ${accepted[leaf] ?? describe(issue)}.`;
}

function shown(value: unknown): string {
  const text = JSON.stringify(value);
  return text.length <= 40 ? text : `${text.slice(0, 37)}…`;
}

/** What would be accepted, in words, from the issue itself. */
function describe(issue: Issue): string {
  switch (issue.code) {
    case 'invalid_type':
      return issue.expected === 'object' ? 'a JSON object' : `a value of type ${issue.expected}`;
    case 'invalid_value':
      return issue.values.map((entry) => JSON.stringify(entry)).join(', ');
    case 'too_small':
      return issue.origin === 'string'
        ? 'a text that is not empty'
        : `a number ${issue.inclusive === true ? 'from' : 'above'} ${issue.minimum}`;
    case 'too_big':
      return issue.origin === 'string' ? `at most ${issue.maximum} characters` : `a number up to ${issue.maximum}`;
    default:
      return issue.message;
  }
}
