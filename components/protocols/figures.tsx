import { View } from 'react-native';
import { Label, Num } from '@/components/ui';
import { deflectionParts } from '@/shared/lib/format-angle';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatSignificant } from '@/shared/lib/format-number';
import { formatClock, zoneName } from '@/shared/lib/format-time';
import type { Plan } from './plan';

const unsigned = (text: string) => text.replace(/^\+/, '');

function signalWords(plan: Plan): { value: string; unit: string; label: string } {
  if (plan.signal === null) return { value: '–', unit: '', label: 'near − far not predictable yet' };
  const { number, unit } = deflectionParts(plan.signal.signalRad);
  const mm = plan.signal.signalM === null ? '' : `, ${formatSignificant(plan.signal.signalM * 1000, 3)} mm`;
  return { value: unsigned(number), unit, label: `near − far${mm}` };
}

/** Finish time, the largest; length and signal beside it. */
export function Figures({ plan, timeZone, startAt }: { plan: Plan; timeZone: string; startAt: string }) {
  const end = plan.timeline.endUtcMs;
  const signal = signalWords(plan);
  const weekday = formatClock(end, { timeZone, weekday: true }).split(' ')[1] ?? '';
  return (
    <View className="flex-row flex-wrap items-start gap-x-6 gap-y-2">
      <View>
        <Num
          size={44}
          light
          testID="finish-time"
          aria-label={`Finish at ${formatClock(end, { timeZone })} ${weekday}, ${zoneName(timeZone)}`}
        >
          {plan.timeline.truncated ? '–' : formatClock(end, { timeZone })}
        </Num>
        <Label>
          {plan.timeline.truncated ? 'no end in sight' : `finish ${weekday}, ${startAt === '' ? 'started now' : `started at ${startAt}`}`}
        </Label>
        <Label>{zoneName(timeZone)}</Label>
      </View>
      <View className="gap-2 pt-1.5 wide:flex-row wide:gap-6">
        <View>
          <Num size={17} testID="total-time">
            {plan.timeline.truncated ? '–' : formatDuration(plan.timeline.durationS)}
          </Num>
          <Label>
            length, {plan.timeline.dwells} {plan.timeline.dwells === 1 ? 'dwell' : 'dwells'}
          </Label>
          {plan.mostS > plan.timeline.durationS + 1 && !plan.timeline.truncated ? (
            <Label testID="most-time">{formatDuration(plan.mostS)} if conditions keep it waiting</Label>
          ) : null}
        </View>
        <View>
          <Num size={17} aside={signal.unit} testID="signal">
            {signal.value}
          </Num>
          <Label>{signal.label}</Label>
        </View>
      </View>
    </View>
  );
}
