import * as z from 'zod';
import { fieldWords } from '@/server/http/field-words';
import { linkSettingsSchema } from '@/shared/contracts/rigs';

/** Whoever reads the refusal of a field learns what would be right, and nothing of the library that found it. */

const wordsOf = (schema: z.ZodType, value: unknown) => schema.safeParse(value, { error: fieldWords }).error?.issues[0]?.message;

test.each([
  [z.string(), undefined, 'is missing: a text is needed'],
  [z.number(), '3', 'a number is needed'],
  [z.number(), Number.NaN, 'a number is needed'],
  [z.number().int(), 80.5, 'a whole number is needed'],
  [z.boolean(), 'yes', 'true or false is needed'],
  [z.array(z.number()), 3, 'a list is needed'],
  [z.strictObject({}), [], 'an object is needed'],
  [z.number().max(30), 31, 'it has to be at most 30'],
  [z.number().min(-3), -4, 'it has to be at least -3'],
  [z.number().positive(), 0, 'it has to be more than 0'],
  [z.number().lt(7), 7, 'it has to be less than 7'],
  [z.number().multipleOf(5), 7, 'a multiple of 5 is needed'],
  [z.string().min(1), '', 'it has to be at least 1 character'],
  [z.string().max(3), 'four', 'it has to be at most 3 characters'],
  [z.string().length(8), 'four', 'it has to be exactly 8 characters'],
  [z.array(z.number()).min(2), [1], 'it has to be at least 2 entries'],
  [z.enum(['near', 'far']), 'left', 'one of "near", "far" is needed'],
  [z.literal(true), false, 'true is needed'],
  [z.iso.datetime(), 'tonight', 'an instant in UTC is needed, for example 2031-02-14T20:00:00Z'],
  [z.iso.date(), 'today', 'a date is needed, for example 2031-02-14'],
  [z.email(), 'ilse', 'a mail address is needed, for example name@lab.example'],
  [linkSettingsSchema, { kind: 'radio' }, 'one of "simulated", "board", "serial", "tcp" is needed'],
])('%#: %p', (schema, value, words) => {
  expect(wordsOf(schema, value)).toBe(words);
});

test.each([
  [{ kind: 'tcp', host: '10.0.0.4:4001', port: 4001 }, 'a host name or an address is needed, without http:// and without a port'],
  [{ kind: 'tcp', host: '10.0.0.4', port: 70_000 }, 'a whole number from 1 to 65535 is needed'],
  [{ kind: 'serial', path: '/dev/ttyUSB0', baudRate: 9600.5 }, 'a whole number from 300 to 1000000 is needed'],
])('a schema that says it itself keeps its words: %p', (link, words) => {
  expect(wordsOf(linkSettingsSchema, link)).toBe(words);
});

test.each(['rig-lab.example', '10.0.0.4', '::1', 'fe80::1', 'fd00:1::7'])('%s is a host of a network serial server', (host) => {
  expect(linkSettingsSchema.safeParse({ kind: 'tcp', host, port: 4001 }).success).toBe(true);
});
