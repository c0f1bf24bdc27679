import { View } from 'react-native';
import { UncertainText } from '@/components/evaluation/uncertain-text';
import { Label, Num } from '@/components/ui';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatPercent } from '@/shared/lib/format-number';
import { formatClock, zoneName } from '@/shared/lib/format-time';
import { formatUncertain } from '@/shared/lib/format-uncertain';
import type { NightForecast } from '@/shared/planning/night-forecast';
import type { Plan } from './plan';

/** Predicted near minus far with the u that the rig's own leave it. */
function Signal({ plan: { signal, signalU } }: { plan: Plan }) {
  if (signal === null)
    return (
      <View>
        <Num size={17} testID="signal">
          –
        </Num>
        <Label>near − far not predictable yet</Label>
      </View>
    );
  const of = (value: number, relative: number | undefined) => ({ value, u: relative === undefined ? null : Math.abs(value) * relative });
  const onScale =
    signal.signalM === null ? '' : `, ${formatUncertain({ ...of(signal.signalM * 1000, signalU?.onScale), unit: 'mm' }, { exponent: 0 })}`;
  return (
    <View>
      <UncertainText size={17} {...of(signal.signalRad * 1e3, signalU?.angle)} unit="mrad" options={{ exponent: 0 }} testID="signal" />
      <Label>near − far{onScale}</Label>
    </View>
  );
}

interface FiguresProps {
  plan: Plan;
  /** Null where the plan gives no G. */
  forecast: NightForecast | null;
  timeZone: string;
  startAt: string;
}

/** Finish time, the largest; length, signal and u of G beside it. */
export function Figures({ plan, forecast, timeZone, startAt }: FiguresProps) {
  const end = plan.timeline.endUtcMs;
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
        <Signal plan={plan} />
        {forecast === null ? null : (
          <View>
            <Num size={17} testID="figure-u">
              {formatPercent(forecast.predicted.relativeU)}
            </Num>
            <Label>u(G)/G after the night</Label>
          </View>
        )}
      </View>
    </View>
  );
}
