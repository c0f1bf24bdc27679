import { useLab } from '@/components/api';
import { Label } from '@/components/ui';
import type { readSamples } from '@/shared/contracts/data';
import type { ResponseOf } from '@/shared/contracts/route';
import { formatDayAndClock } from '@/shared/lib/format-time';

/** Where summaries alone are left of what is plotted; nothing where all samples are there. */
export function ThinnedNote({ thinned }: { thinned: ResponseOf<typeof readSamples>['thinned'] }) {
  const { timeZone } = useLab();
  const last = thinned.at(-1);
  if (last === undefined) return null;
  return (
    <Label testID="thinned-note">
      Summaries of 2&nbsp;s are left of {thinned.length === 1 ? 'a stretch' : `${String(thinned.length)} stretches`} of it, the last up to{' '}
      {formatDayAndClock(last.toUtcMs, timeZone)}: least and greatest of each are drawn. Exports hold what is left at full rate.
    </Label>
  );
}
