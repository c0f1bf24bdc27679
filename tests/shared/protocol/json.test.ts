import Ajv2020 from 'ajv/dist/2020';
import * as fc from 'fast-check';
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { checkDocumentText } from '@/shared/protocol/check';
import { protocolDocumentSchema } from '@/shared/protocol/document';
import { exportProtocolText } from '@/shared/protocol/json';
import { locateJsonError } from '@/shared/protocol/json-position';
import { protocolJsonSchema, protocolJsonSchemaText } from '@/shared/protocol/json-schema';
import { templates } from '@/shared/protocol/templates';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import { documents } from './arbitraries';

const validate = new Ajv2020({ strict: true, strictRequired: false, allErrors: true }).compile(protocolJsonSchema());

test('the checked-in schema is the generated one (otherwise write protocolJsonSchemaText() to public/schemas/protocol-1.json)', () => {
  expect(readFileSync(join(__dirname, '../../../public/schemas/protocol-1.json'), 'utf8')).toBe(protocolJsonSchemaText());
});

test('the schema is JSON Schema 2020-12 and takes every built-in template', () => {
  expect(protocolJsonSchema()['$schema']).toBe('https://json-schema.org/draft/2020-12/schema');
  for (const template of templates)
    expect({ id: template.id, valid: validate(template.make(demoRigWide)) }).toEqual({ id: template.id, valid: true });
});

test('the schema takes steps that are not built yet, as the format has them', () => {
  const document = {
    formatVersion: 1,
    name: 'All kinds',
    notes: '',
    onInterruption: 'resume',
    atEnd: { station: 'clear', drivers: 'keep' },
    goodWhen: { residual_urad: 40, channels: [{ channel: 'box temperature', slopeBelow_per_h: 0.3 }] },
    evaluation: { method: 'equilibrium', drift: 'aba', channel: 'deflection' },
    steps: [
      { kind: 'home' },
      { kind: 'swing', to: { angle_deg: 20 }, profile: 'shaped', speed_deg_s: 1, acceleration_deg_s2: 1 },
      { kind: 'kick', amplitude_urad: 2000, periods: 3 },
      { kind: 'settle', calmWhen: { amplitude_urad: 50, drift_urad_per_h: 20, window_s: 900 }, atMost_s: 14400, otherwise: 'continue' },
      { kind: 'wait', until: { channel: 'box temperature', slopeBelow_per_h: 0.1, for_s: 60 }, atMost_s: 5400, otherwise: 'continue' },
      { kind: 'proof', sign: true, size: 0.2, period: null, otherwise: 'hold' },
      { kind: 'mark', label: 'x', frame: true },
      { kind: 'prompt', text: 'x', otherwise: 'stop' },
      { kind: 'rotate', period_s: 1800, turns: -3 },
      { kind: 'repeat', until: { relativeStatisticalU: 0.001 }, atLeast: 20, atMost: 60, steps: [{ kind: 'dwell', periods: 2 }] },
      {
        kind: 'repeat',
        times: 2,
        counting: 'good',
        atMost: 5,
        order: 'shuffled',
        steps: [{ kind: 'repeat', until: { localTime: '06:30' }, steps: [{ kind: 'dwell', for_s: 600 }] }],
      },
    ],
  };
  expect(validate(document)).toBe(true);
  expect(protocolDocumentSchema.safeParse(document).success).toBe(true);
});

test.each<[string, unknown]>([
  ['an unknown field', { kind: 'home', speed: 1 }],
  ['an unknown kind', { kind: 'swivel' }],
  ['a dwell of no length', { kind: 'dwell' }],
  ['a dwell of two lengths', { kind: 'dwell', for_s: 1, periods: 2 }],
  ['a repeat without a count', { kind: 'repeat', steps: [{ kind: 'home' }] }],
  ['a repeat with count and condition', { kind: 'repeat', times: 2, until: { localTime: '06:30' }, steps: [] }],
  ['a rotation of no turn', { kind: 'rotate', period_s: 60, turns: 0 }],
  ['half a turn', { kind: 'rotate', period_s: 60, turns: 0.5 }],
  ['a wait for a channel to do nothing', { kind: 'wait', until: { channel: 'x' } }],
  ['a time that is none', { kind: 'wait', until: { localTime: '24:00' } }],
  ['settling without a criterion', { kind: 'settle', calmWhen: { window_s: 60 } }],
  ['a prompt that goes on by itself', { kind: 'prompt', text: 'x', otherwise: 'continue' }],
])('schema and program refuse alike: %s', (_, step) => {
  const document = { formatVersion: 1, name: 'x', steps: [step] };
  expect(validate(document)).toBe(false);
  expect(protocolDocumentSchema.safeParse(document).success).toBe(false);
});

test('an exported text reads back as the same document, and exporting that gives the same text', () => {
  fc.assert(
    fc.property(documents, (document) => {
      const text = exportProtocolText(document);
      const read = checkDocumentText(text);
      expect(read).toEqual({ document, findings: [] });
      expect(exportProtocolText(Object.fromEntries(Object.entries(document).reverse()) as typeof document)).toBe(text);
      expect(validate(JSON.parse(text))).toBe(true);
    }),
  );
});

test('a file begins with the version and ends with the steps and a newline', () => {
  const text = exportProtocolText({ steps: [{ for_s: 60, kind: 'dwell' }], name: 'Order', formatVersion: 1, notes: 'n' });
  expect(text).toBe(
    '{\n  "formatVersion": 1,\n  "name": "Order",\n  "notes": "n",\n  "steps": [\n    {\n      "kind": "dwell",\n      "for_s": 60\n    }\n  ]\n}\n',
  );
});

describe('where a text stops being JSON', () => {
  test.each([
    ['', 1, 1, 'The text ends'],
    ['{"a": 1,}', 1, 9, 'Remove the comma'],
    ['[1, 2,]', 1, 7, 'Remove the comma'],
    ['{"a" 1}', 1, 6, 'colon'],
    ["{'a': 1}", 1, 2, 'a name in double quotes'],
    ['{"a": nope}', 1, 7, 'a value is expected'],
    ['{"a": 01}', 1, 7, 'a value is expected'],
    ['{"a": 1.}', 1, 7, 'a value is expected'],
    ['{\r\n"a": 1\r\n"b": 2}', 3, 1, 'comma'],
    ['{"a": "x\ny"}', 1, 9, 'not closed on its line'],
    ['{"a": "\\x"}', 1, 8, 'backslash'],
    ['{"a": "x', 1, 9, 'Close them'],
    ['{"a": 1} x', 1, 10, 'after the end'],
    ['{"a": 1, "a": 2}', 1, 10, 'comes twice'],
    ['[1', 1, 3, 'comma or "]"'],
    ['// note\n{}', 1, 1, 'a value is expected'],
  ] as const)('%j: line %p, column %p', (...[text, line, column, words]) => {
    expect(locateJsonError(text)).toEqual({ line, column, message: expect.stringContaining(words) as string });
  });

  test('accepts what the language itself accepts', () => {
    fc.assert(fc.property(fc.json(), (text) => expect(locateJsonError(text)).toBeNull()));
  });

  test('refuses what the language itself refuses', () => {
    fc.assert(
      fc.property(fc.json(), fc.nat(), fc.constantFrom('', ',', '}', ']', '"', '\\', 'x', '-', ':'), (text, at, put) => {
        const index = at % (text.length + 1);
        const broken = text.slice(0, index) + put + text.slice(index + 1);
        const parses = (() => {
          try {
            JSON.parse(broken);
            return true;
          } catch {
            return false;
          }
        })();
        const error = locateJsonError(broken);
        if (!parses) expect(error).not.toBeNull();
        else if (error !== null) expect(error.message).toContain('comes twice');
      }),
      { numRuns: 500 },
    );
  });

  test('a hundred thousand brackets are refused, not a crash', () => {
    expect(locateJsonError('['.repeat(100_000))?.message).toContain('nested too deeply');
  });
});
