import { formatDegrees } from '@/shared/lib/format-angle';
import { formatDuration } from '@/shared/lib/format-duration';

/** What the row of the step says already. */
const saidAbove: ReadonlySet<string> = new Set(['seq', 'path', 'kind', 'label', 'station', 'commandId']);

const names: Record<string, string> = {
  bootId: 'boot id',
  gapS: 'gap',
  angleDeg: 'angle',
  offDeg: 'off by',
  slipDeg: 'slip',
  slipSteps: 'slip in microsteps',
  toleranceDeg: 'tolerance',
  edge: 'motion',
  spanS: 'somewhere within',
  takenUpBy: 'by',
  sha256: 'SHA-256',
};

/** As the tests of a proof have them. */
const hasWords = (item: unknown): item is { words: string } =>
  typeof item === 'object' && item !== null && typeof (item as { words?: unknown }).words === 'string';

function valueWords(name: string, value: unknown): string {
  if (typeof value === 'number') {
    if (name.endsWith('S')) return value < 60 ? `${value.toFixed(1)} s` : formatDuration(value);
    if (name.endsWith('Deg')) return formatDegrees(value, name === 'angleDeg' ? 2 : 3);
  }
  if (typeof value === 'boolean') return value ? 'yes' : 'no';
  if (Array.isArray(value) && value.length > 0 && value.every(hasWords)) return value.map(({ words }) => words).join('; ');
  return typeof value === 'object' ? JSON.stringify(value) : String(value);
}

/** The facts of an event in one line for people: named, rounded, with units. Whole values stand in the archive. */
export function eventFacts(data: Record<string, unknown>): string {
  return Object.entries(data)
    .filter(([name, value]) => !saidAbove.has(name) && value !== '' && value !== null)
    .map(([name, value]) => `${names[name] ?? name} ${valueWords(name, value)}`)
    .join(' · ');
}
