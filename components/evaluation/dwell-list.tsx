import { Pressable, View } from 'react-native';
import { laneOf } from '@/components/charts';
import { Body, Icon, Label, Section } from '@/components/ui';
import type { DwellResult } from '@/shared/evaluation/result';
import { UncertainText } from './uncertain-text';

interface DwellListProps {
  dwells: readonly DwellResult[];
  selected: number | null;
  onSelect: (seq: number) => void;
}

/** Every dwell: fitted centre, whether it counts and, if not, why. Choosing one shows its fit. */
export function DwellList({ dwells, selected, onSelect }: DwellListProps) {
  const used = dwells.filter((dwell) => dwell.used).length;
  return (
    <Section
      title="Dwells"
      remark={`${used} of ${dwells.length} used. The centre is the fitted equilibrium at mid-dwell, drift not removed.`}
    >
      <View role="list" testID="dwell-list">
        {dwells.map((dwell, index) => (
          <DwellLine key={dwell.seq} dwell={dwell} chosen={dwell.seq === selected} last={index === dwells.length - 1} onSelect={onSelect} />
        ))}
      </View>
    </Section>
  );
}

function DwellLine({
  dwell,
  chosen,
  last,
  onSelect,
}: {
  dwell: DwellResult;
  chosen: boolean;
  last: boolean;
  onSelect: (seq: number) => void;
}) {
  const lane = laneOf(dwell.station);
  const theta = dwell.theta_rad;
  return (
    <View role="listitem">
      <Pressable
        role="button"
        aria-pressed={chosen}
        aria-label={`Show the fit of dwell ${dwell.seq} at ${dwell.station}, ${dwell.used ? 'used' : `not used: ${dwell.why ?? 'no reason given'}`}`}
        onPress={() => onSelect(dwell.seq)}
        className={`min-h-target flex-row items-center gap-3 py-2 hover:bg-panel ${chosen ? 'bg-panel' : ''} ${last ? '' : 'border-b border-line'}`}
        testID="dwell-row"
      >
        <Label className="w-9 flex-none pl-1 font-mono tabular">{dwell.seq}</Label>
        <Icon name={lane === 'other' ? 'clear' : lane} size={14} tone={lane === 'near' ? 'near' : lane === 'far' ? 'far' : 'dim'} />
        <Body className="w-14 flex-none">{dwell.station}</Body>
        <View className="min-w-0 flex-1">
          {theta === null ? (
            <Label>no fit</Label>
          ) : (
            <UncertainText value={theta.value * 1e3} u={theta.u * 1e3} unit="mrad" options={{ signed: true, exponent: 0 }} />
          )}
          {dwell.used ? null : <Label tone="text">not used: {dwell.why ?? 'no reason given'}</Label>}
        </View>
        <Icon name={dwell.used ? 'tick' : 'failed'} size={16} tone={dwell.used ? 'good' : 'danger'} />
      </Pressable>
    </View>
  );
}
