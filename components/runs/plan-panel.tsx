import { memo } from 'react';
import { View } from 'react-native';
import { PlanView } from '@/components/charts';
import { isMotion } from '@/components/charts/strip-model';
import { Label, Num, Panel } from '@/components/ui';
import type { LiveMessages, RunView, StepRowView } from '@/shared/contracts/runs';
import { formatDegrees } from '@/shared/lib/format-angle';
import { formatTimeUncertainty } from '@/shared/lib/format-duration';
import { formatUtcHonest } from '@/shared/lib/format-time';

interface PlanPanelProps {
  view: RunView;
  rows: readonly StepRowView[];
  beat: LiveMessages['beat'] | null;
  lost: boolean;
  large?: boolean;
}

const sources: Record<StepRowView['angleSource'], string> = {
  counted: 'counted steps',
  'edge-verified': 'proved at the home edge',
  encoder: 'read by the encoder',
};

/** The turntable from above with its angle in figures and the last motion's end with its uncertainty. */
export const PlanPanel = memo(function PlanPanel({ view, rows, beat, lost, large = false }: PlanPanelProps) {
  const moved = rows.findLast((row) => isMotion(row) && row.endUtcMs !== null);
  const angleDeg = beat?.angleDeg ?? moved?.angleEndDeg ?? null;
  // The controller answers and does not know where the table stands: it restarted, or homes.
  const unknown = !view.rehearsal && beat?.link === 'ready' && beat.angleDeg === null;
  const old = lost || unknown;
  return (
    <Panel className={large ? 'items-center gap-4' : 'flex-row items-center gap-5'}>
      <PlanView rig={view.rig} angleDeg={angleDeg} sizePx={large ? 260 : 132} old={old} />
      <View className={large ? 'w-full flex-row justify-between gap-4' : 'min-w-0 shrink gap-3'}>
        <View>
          <Label>Turntable{old ? ', last known' : ''}</Label>
          <Num size={24} tone={old ? 'dim' : 'text'} testID="turntable-angle">
            {formatDegrees(angleDeg)}
          </Num>
          {unknown ? <Label tone="text">position not known</Label> : moved && large ? <Label>{sources[moved.angleSource]}</Label> : null}
        </View>
        {moved?.endUtcMs == null ? null : (
          <View>
            <Label>Last motion ended</Label>
            <Num size={15}>{formatUtcHonest(moved.endUtcMs, moved.uEndS)}</Num>
            <Label>
              <Num size={13} tone="dim">
                {moved.uEndS === null ? '' : formatTimeUncertainty(moved.uEndS)}
              </Num>{' '}
              UTC
            </Label>
          </View>
        )}
      </View>
    </Panel>
  );
});
