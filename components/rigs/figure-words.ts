import type { StartCheck } from '@/shared/contracts/rigs';
import { formatDegrees } from '@/shared/lib/format-angle';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatFixed, NARROW_SPACE } from '@/shared/lib/format-number';

/** A figure of a start check as it is read: `0.8 ms`, `2 h 12 min`, `23.4 GiB`; an en dash where it is not known. Pure. */
export function figureWords({ value, unit }: StartCheck['figures'][number]): string {
  if (value === null) return '–';
  switch (unit) {
    case 's':
      return formatDuration(value);
    case 'deg':
      return formatDegrees(value);
    case '':
      return formatFixed(value, { decimals: 0 });
    default:
      return `${formatFixed(value, { decimals: Math.abs(value) < 1 ? 2 : 1 })}${NARROW_SPACE}${unit}`;
  }
}
