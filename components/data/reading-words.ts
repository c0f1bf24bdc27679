import type { Reading } from '@/components/charts/reading';
import { formatKnownReading, formatReading } from '@/shared/lib/format-angle';

/** What a plot reads out under its cursor, in the unit of the channel. Pure. */
export function readingWords(reading: Reading | null, unit: string): string {
  if (reading === null) return 'no data';
  if (reading.kind === 'range') {
    const [least, greatest] = [formatReading(reading.least, unit), formatReading(reading.greatest, unit)];
    return least === greatest ? least : `${least} to ${greatest}`;
  }
  return formatKnownReading(reading, unit);
}
