import { View } from 'react-native';
import { Label, Num } from '@/components/ui';
import { deflectionParts } from '@/shared/lib/format-angle';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatPercent, formatSignificant } from '@/shared/lib/format-number';
import { formatClock, zoneName } from '@/shared/lib/format-time';
import type { NightForecast } from '@/shared/planning/night-forecast';
import type { Plan } from './plan';

const unsigned = (text: string) => text.replace(/^\+/, '');

function signalWords(plan: Plan): { value: string; unit: string; label: string } {
  if (plan.signal === null) return { value: '–', unit: '', label: 'near − far not predictable yet' };
  const { number, unit } = deflectionParts(plan.signal.signalRad);
  const mm = plan.signal.signalM === null ? '' : `, ${formatSignificant(plan.signal.signalM * 1000, 3)} mm`;
  return { value: unsigned(number), unit, label: `near − far${mm}` };
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
