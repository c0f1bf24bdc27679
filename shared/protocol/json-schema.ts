import * as z from 'zod';
import { protocolDocumentSchema, type StepKind } from './document';
import { fieldNotes, kindNotes } from './schema-notes';

/** Address of the published schema, below the server's root. */
const schemaPath = '/schemas/protocol-1.json';

type JsonObject = Record<string, unknown>;

/** Of these fields exactly one is given: said in zod by a refinement, which no generator can carry over. */
const oneOf = (fields: readonly string[]) => ({ oneOf: fields.map((field) => ({ required: [field] })) });

const extra: Record<string, JsonObject> = {
  dwell: oneOf(['for_s', 'periods', 'beat_periods']),
  settle: oneOf(['for_s', 'calmWhen']),
  repeat: oneOf(['times', 'until']),
};

function annotate(jsonSchema: object, kind: StepKind, properties: Record<string, JsonObject>): void {
  Object.assign(jsonSchema, { description: kindNotes[kind] }, extra[kind]);
  for (const [name, property] of Object.entries(properties)) {
    const note = fieldNotes[`${kind}.${name}`];
    if (note !== undefined) property['description'] = note;
  }
}

/**
 * The JSON Schema (2020-12) of the protocol document, generated from the zod schema. It says what is written how; what a protocol needs
 * beyond that (stations, free paths, lengths) depends on the rig.
 */
export function protocolJsonSchema(): JsonObject {
  const generated = z.toJSONSchema(protocolDocumentSchema, {
    target: 'draft-2020-12',
    io: 'input',
    override: ({ jsonSchema }) => {
      const properties = jsonSchema.properties as Record<string, JsonObject> | undefined;
      const kind = properties?.['kind']?.['const'];
      if (typeof kind === 'string') annotate(jsonSchema, kind as StepKind, properties ?? {});
      if (properties?.['slopeBelow_per_h'] !== undefined && properties['for_s'] !== undefined)
        Object.assign(jsonSchema, oneOf(['below', 'slopeBelow_per_h']));
      if (properties?.['window_s'] !== undefined)
        Object.assign(jsonSchema, { anyOf: [{ required: ['amplitude_urad'] }, { required: ['drift_urad_per_h'] }] });
      if (properties?.['turns'] !== undefined) Object.assign(properties['turns'] ?? {}, { not: { const: 0 } });
    },
  }) as JsonObject;
  const { $schema, $defs, ...body } = generated;
  const named = { $schema, $id: schemaPath, title: 'Evenfall protocol, format 1', ...body, $defs };
  return JSON.parse(JSON.stringify(named).replaceAll('__schema0', 'step')) as JsonObject;
}

/** The text of the checked-in copy of the schema. */
export function protocolJsonSchemaText(): string {
  return `${JSON.stringify(protocolJsonSchema(), null, 2)}\n`;
}
