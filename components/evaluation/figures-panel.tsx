import { View } from 'react-native';
import { Label, Panel } from '@/components/ui';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { clockName, clockWords } from './evaluation-words';
import { UncertainText } from './uncertain-text';

/** Near − far or the swing of a modulation, period, decay time, κ and the clock offset, each with its uncertainty. */
export function FiguresPanel({ result }: { result: EvaluationResult }) {
  const { reversal_rad: reversal, period_s: period, decayTime_s: decay, kappa_N_m: kappa, alignment, modulation } = result;
  const offset = alignment?.clockOffset_s ?? null;
  const clock = clockWords(result);
  return (
    <Panel className="gap-4" testID="figures">
      <View className="flex-row flex-wrap gap-x-8 gap-y-4">
        {reversal === null ? null : (
          <Figure
            name={`near − far, ${reversal.count} reversal${reversal.count === 1 ? '' : 's'}`}
            value={reversal.value * 1e3}
            u={reversal.u === null ? null : reversal.u * 1e3}
            unit="mrad"
          />
        )}
        {modulation === undefined ? null : (
          <Figure
            name={`at twice the turntable's angle, ${modulation.turns} turn${modulation.turns === 1 ? '' : 's'}`}
            value={modulation.amplitude_rad.value * 1e3}
            u={modulation.amplitude_rad.u === null ? null : modulation.amplitude_rad.u * 1e3}
            unit="mrad"
          />
        )}
        {period === null ? null : <Figure name="damped period" {...period} unit="s" />}
        {decay === null ? null : <Figure name="decay time" {...decay} unit="s" />}
        {kappa === null ? null : <Figure name="κ of the fibre" {...kappa} unit={'N\u202fm/rad'} />}
        {offset === null ? null : <Figure name={clockName(alignment)} {...offset} unit="s" />}
      </View>
      {clock === '' ? null : (
        <Label tone="text" testID="clock-effect">
          {clock}
        </Label>
      )}
    </Panel>
  );
}

function Figure({ name, ...quantity }: { name: string; value: number; u: number | null; unit: string }) {
  return (
    <View className="min-w-[140px]">
      <UncertainText {...quantity} size={20} />
      <Label>{name}</Label>
    </View>
  );
}
