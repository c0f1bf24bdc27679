import { useMemo } from 'react';
import { Pressable, View } from 'react-native';
import { beyondAxes, laneOf, ResidualPlot, sharedAxes, type Lane, type SharedAxes } from '@/components/charts';
import { Label, Section } from '@/components/ui';
import { residualRms } from '@/shared/evaluation/residual-rms';
import type { FitCurve } from '@/shared/evaluation/result';
import { formatDeflectionUncertain } from '@/shared/lib/format-angle';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatSignificant } from '@/shared/lib/format-number';

interface SideBySidePanelProps {
  curves: readonly FitCurve[];
  selected: number | null;
  onSelect: (seq: number) => void;
}

const lanes: readonly { lane: Lane; name: string }[] = [
  { lane: 'near', name: 'Near' },
  { lane: 'far', name: 'Far' },
  { lane: 'other', name: 'Elsewhere' },
];

const microrad = (rad: number) => `${formatSignificant(rad * 1e6, 2)} µrad`;

/** What the fits leave of every dwell, near beside far, on the same axes: a bad dwell or a side that is noisier is seen at a glance. */
export function SideBySidePanel({ curves, selected, onSelect }: SideBySidePanelProps) {
  const axes = useMemo(() => sharedAxes(curves), [curves]);
  const columns = lanes
    .map(({ lane, name }) => ({ name, curves: curves.filter(({ station }) => laneOf(station) === lane) }))
    .filter((column) => column.curves.length > 0);
  if (curves.length < 2) return null;
  const [from, to] = axes.timeS;
  return (
    <Section
      title="Dwells side by side"
      remark={`Data minus fit, all on the same axes: ±${microrad(axes.reachRad)} over ${formatDuration(to - from)}; an arrow marks what lies beyond. A tap shows the fit.`}
    >
      <View className="flex-row gap-4" testID="side-by-side">
        {columns.map((column) => (
          <View key={column.name} className="min-w-0 flex-1 gap-1">
            <Label tone="text">{column.name}</Label>
            <View role="list" aria-label={`Dwells: ${column.name.toLowerCase()}`} className="gap-2">
              {column.curves.map((curve) => (
                <Small key={curve.seq} curve={curve} axes={axes} chosen={curve.seq === selected} onSelect={onSelect} />
              ))}
            </View>
          </View>
        ))}
      </View>
    </Section>
  );
}

interface SmallProps {
  curve: FitCurve;
  axes: SharedAxes;
  chosen: boolean;
  onSelect: (seq: number) => void;
}

function Small({ curve, axes, chosen, onSelect }: SmallProps) {
  const rms = formatDeflectionUncertain(residualRms(curve));
  const beyond = beyondAxes(curve, axes);
  const out = beyond === null ? null : `${beyond.bins} beyond, to ${microrad(beyond.farthestRad)}`;
  return (
    <View role="listitem">
      <Pressable
        role="button"
        aria-pressed={chosen}
        aria-label={`Dwell ${curve.seq} at ${curve.station}, residual rms ${rms}${out === null ? '' : `, ${out}`}: show its fit`}
        onPress={() => {
          onSelect(curve.seq);
          document.querySelector('[data-testid="fit-panel"]')?.scrollIntoView({ block: 'nearest' });
        }}
        className={`min-h-target rounded-action border px-1 py-1 hover:bg-panel2 ${chosen ? 'border-lamp' : 'border-line'}`}
        testID="small-dwell"
      >
        <View className="flex-row flex-wrap justify-between gap-x-2">
          <Label>{curve.seq}</Label>
          <Label>rms {rms}</Label>
        </View>
        {out === null ? null : <Label tone="text">{out}</Label>}
        <ResidualPlot curve={curve} axes={axes} />
      </Pressable>
    </View>
  );
}
