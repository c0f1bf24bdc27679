import * as z from 'zod';

/** What would be right for a field that does not fit its schema, in words; schemas that say it themselves keep their own. */
export const fieldWords: z.core.$ZodErrorMap = (issue) => {
  switch (issue.code) {
    case 'invalid_type':
      return `${issue.input === undefined ? 'is missing: ' : ''}${kindWords[issue.expected] ?? `${issue.expected} is needed`}`;
    case 'invalid_value':
      return oneOf(issue.values);
    case 'too_big':
      return amount(issue, issue.maximum, issue.inclusive === false ? 'less than' : 'at most');
    case 'too_small':
      return amount(issue, issue.minimum, issue.inclusive === false ? 'more than' : 'at least');
    case 'not_multiple_of':
      return `a multiple of ${String(issue.divisor)} is needed`;
    case 'invalid_format':
      return formatWords[issue.format];
    case 'invalid_union':
      // A choice by its kind, of which there is no such kind.
      return Array.isArray(issue['options']) ? oneOf(issue['options'] as z.core.util.Primitive[]) : undefined;
    default:
      return undefined;
  }
};

const kindWords: Record<string, string> = {
  array: 'a list is needed',
  boolean: 'true or false is needed',
  int: 'a whole number is needed',
  number: 'a number is needed',
  object: 'an object is needed',
  record: 'an object is needed',
  string: 'a text is needed',
};

const formatWords: Record<string, string> = {
  date: 'a date is needed, for example 2031-02-14',
  datetime: 'an instant in UTC is needed, for example 2031-02-14T20:00:00Z',
  email: 'a mail address is needed, for example name@lab.example',
  uuid: 'an identifier is needed, for example 0190a5c2-7d4e-4b6f-8a1b-2c3d4e5f6a7b',
};

const oneOf = (values: readonly z.core.util.Primitive[]) =>
  `${values.length === 1 ? '' : 'one of '}${values.map((value) => (typeof value === 'string' ? `"${value}"` : String(value))).join(', ')} is needed`;

const counted: Record<string, [string, string]> = {
  string: ['character', 'characters'],
  array: ['entry', 'entries'],
  set: ['entry', 'entries'],
};

function amount({ origin, exact }: { origin: string; exact?: boolean }, bound: number | bigint, words: string): string {
  const [one, many] = counted[origin] ?? ['', ''];
  return `it has to be ${exact === true ? 'exactly' : words} ${String(bound)} ${Number(bound) === 1 ? one : many}`.trimEnd();
}
