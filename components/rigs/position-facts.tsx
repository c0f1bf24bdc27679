import { View } from 'react-native';
import { Body, Icon, Label, Num } from '@/components/ui';
import type { PositionView } from '@/shared/contracts/position';
import { formatFixed, formatSignificant } from '@/shared/lib/format-number';
import { formatDayAndClock } from '@/shared/lib/format-time';

interface PositionFactsProps {
  position: PositionView | null;
  timeZone: string;
}

const directions = { ccw: 'counter-clockwise', cw: 'clockwise' } as const;

/** How well the counted angle is proved: the last pass of the home edge, slip, backlash, and what came since. */
export function PositionFacts({ position, timeZone }: PositionFactsProps) {
  if (position === null || (position.provedAt === null && position.slippedAt === null))
    return <Body tone="dim">Not proved yet. The first homing or pass of the home edge in a run does it.</Body>;
  const slipped = position.slippedAt !== null;
  return (
    <View className="gap-3" testID="position-facts">
      {slipped ? <Slipped position={position} timeZone={timeZone} /> : null}
      <View className="flex-row flex-wrap gap-x-6 gap-y-3">
        <Fact label="Last proof" testID="position-proved">
          {position.provedAt === null ? 'none in this run' : formatDayAndClock(Date.parse(position.provedAt), timeZone)}
        </Fact>
        {slipped || position.direction === null ? null : (
          <Fact label={`Edge met ${directions[position.direction]} at`}>{angle(position.offsetDeg, position.uDeg / Math.SQRT2)}</Fact>
        )}
        <Fact label="Slip since homing" danger={slipped} testID="position-slip">
          {angle(position.slipDeg, position.uDeg)}
        </Fact>
        <Fact label="Backlash" testID="position-backlash">
          {position.backlashDeg === null ? 'not known yet' : angle(position.backlashDeg, position.uDeg)}
        </Fact>
        <Fact label="Tolerance">{`± ${formatFixed(position.toleranceDeg, { decimals: 3 })}°`}</Fact>
        <Fact label="Dwells since the last proof">{String(position.dwellsSince)}</Fact>
      </View>
    </View>
  );
}

/** With the decimals that its uncertainty bears. */
function angle(deg: number | null, uDeg: number): string {
  return deg === null ? '–' : `${formatFixed(deg, { decimals: 3, signed: true })}° ± ${formatSignificant(uDeg, 2)}°`;
}

function Slipped({ position, timeZone }: { position: PositionView; timeZone: string }) {
  const steps = Math.abs(position.slipSteps ?? 0);
  return (
    <View className="flex-row items-start gap-2" role="alert" testID="position-slipped">
      <Icon name="warning" size={18} tone="danger" />
      <Body strong className="min-w-0 shrink">
        The table slipped by {steps} microsteps ({formatFixed(Math.abs(position.slipDeg ?? 0), { decimals: 2 })}°), seen{' '}
        {formatDayAndClock(Date.parse(position.slippedAt ?? ''), timeZone)}. Its count is wrong until the rig is homed.
      </Body>
    </View>
  );
}

function Fact({ label, children, danger = false, testID }: { label: string; children: string; danger?: boolean; testID?: string }) {
  return (
    <View className="max-w-full min-w-[130px]">
      <Label>{label}</Label>
      <Num size={15} tone={danger ? 'danger' : 'text'} {...(testID === undefined ? {} : { testID })}>
        {children}
      </Num>
    </View>
  );
}
