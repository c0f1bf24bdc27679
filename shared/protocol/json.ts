import { documentFields, type ProtocolDocument, type Step, stepFields } from './document';

/**
 * The text of a protocol file: two spaces of indentation, fields in the order of the format, a newline at the end. The same document
 * always gives the same text.
 */
export function exportProtocolText(document: ProtocolDocument): string {
  return `${JSON.stringify(ordered({ ...document, steps: document.steps.map(orderedStep) }, documentFields), null, 2)}\n`;
}

function ordered(value: Record<string, unknown>, fields: readonly string[]): Record<string, unknown> {
  return Object.fromEntries(fields.filter((field) => value[field] !== undefined).map((field) => [field, value[field]]));
}

function orderedStep(step: Step): Record<string, unknown> {
  const fields = stepFields[step.kind].filter((field) => field !== 'steps');
  return step.kind === 'repeat' ? { ...ordered(step, fields), steps: step.steps.map(orderedStep) } : ordered(step, fields);
}
