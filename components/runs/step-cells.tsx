import { View } from 'react-native';
import { Body, Icon, Label, Num, type IconName, type Tone } from '@/components/ui';
import type { StepRowView } from '@/shared/contracts/runs';
import { formatDegrees } from '@/shared/lib/format-angle';
import { formatDelay, formatTimeUncertainty } from '@/shared/lib/format-duration';
import { formatSignificant } from '@/shared/lib/format-number';
import { formatLocalHonest, formatUtcHonest } from '@/shared/lib/format-time';
import { stepMark, stepTitle, type TargetSource } from './run-words';
import { isUnproved, outcomeOf } from './step-filter';

export interface TimeBase {
  /** IANA zone, or null for UTC. */
  timeZone: string | null;
}

const clockText = (utcMs: number, uS: number | null, { timeZone }: TimeBase): string =>
  timeZone === null ? formatUtcHonest(utcMs, uS) : formatLocalHonest(utcMs, uS, timeZone);

/** Planned to the second, actual with its uncertainty, and the difference, which is the thing to see. */
export function InstantCell({
  plannedUtcMs,
  actualUtcMs,
  uS,
  base,
}: {
  plannedUtcMs: number | null;
  actualUtcMs: number | null;
  uS: number | null;
  base: TimeBase;
}) {
  const delayS = plannedUtcMs === null || actualUtcMs === null ? null : (actualUtcMs - plannedUtcMs) / 1000;
  const off = delayS !== null && Math.abs(delayS) >= 1;
  return (
    <View>
      <View className="flex-row flex-wrap items-baseline gap-x-2">
        <Num size={15}>{actualUtcMs === null ? 'running' : clockText(actualUtcMs, uS, base)}</Num>
        {actualUtcMs === null || uS === null ? null : (
          <Num size={13} tone="dim">
            {formatTimeUncertainty(uS)}
          </Num>
        )}
      </View>
      {plannedUtcMs === null ? null : (
        <View className="flex-row flex-wrap items-baseline gap-x-2">
          <Label>
            plan{' '}
            <Num size={13} tone="dim">
              {clockText(plannedUtcMs, 1.5, base).slice(0, 8)}
            </Num>
          </Label>
          {delayS === null ? null : (
            <Num size={13} tone={off ? 'lamp' : 'dim'} strong={off}>
              {formatDelay(delayS)}
            </Num>
          )}
        </View>
      )}
    </View>
  );
}

export function AngleCell({ row }: { row: StepRowView }) {
  if (row.angleStartDeg === null && row.angleEndDeg === null) return <Label>–</Label>;
  const moved = row.angleStartDeg !== null && row.angleEndDeg !== null && Math.abs(row.angleEndDeg - row.angleStartDeg) > 0.05;
  return (
    <View>
      <View className="flex-row flex-wrap items-baseline gap-x-2">
        <Num size={15}>{formatDegrees(row.angleEndDeg ?? row.angleStartDeg, 3)}</Num>
        {row.uAngleDeg === null ? null : (
          <Num size={13} tone="dim">
            ± {formatSignificant(row.uAngleDeg, 2)}°
          </Num>
        )}
      </View>
      {moved ? <Label className="whitespace-nowrap">from {formatDegrees(row.angleStartDeg)}</Label> : null}
      <AngleSource row={row} />
    </View>
  );
}

/** Where the angle comes from; a dwell whose angle nothing proves carries a mark. */
function AngleSource({ row }: { row: StepRowView }) {
  if (!isUnproved(row)) return <Label className="whitespace-nowrap">{row.angleSource}</Label>;
  return (
    <View className="flex-row items-center gap-1" testID="angle-unproved">
      <Icon name="warning" size={14} tone="lamp" />
      <Label tone="lamp" className="whitespace-nowrap">
        counted, not proved
      </Label>
    </View>
  );
}

const outcomeLooks: Record<string, { icon: IconName; tone: Tone }> = {
  done: { icon: 'tick', tone: 'good' },
  running: { icon: 'start', tone: 'lamp' },
  'cut short': { icon: 'warning', tone: 'lamp' },
  late: { icon: 'wait', tone: 'lamp' },
  skipped: { icon: 'forward', tone: 'dim' },
  failed: { icon: 'failed', tone: 'danger' },
};

/** How it ended, how much of its samples is excluded, and how many notes there are to it. */
export function OutcomeCell({ row, excluded, noted }: { row: StepRowView; excluded: string | null; noted: number }) {
  const look =
    row.good === false
      ? { icon: 'failed' as const, tone: 'danger' as const }
      : (outcomeLooks[row.outcome ?? 'running'] ?? { icon: 'note' as const, tone: 'dim' as const });
  return (
    <View className="gap-0.5">
      <View className="flex-row items-center gap-1.5">
        <Icon name={look.icon} size={16} tone={look.tone === 'on-lamp' ? 'onLamp' : look.tone} />
        <Body size={13}>{outcomeOf(row)}</Body>
      </View>
      {excluded === null ? null : (
        <View className="flex-row items-center gap-1.5" testID="row-excluded">
          <Icon name="failed" size={16} tone="lamp" />
          <Body size={13} tone="lamp">
            {excluded}
          </Body>
        </View>
      )}
      {noted === 0 ? null : (
        <View className="flex-row items-center gap-1.5" testID="row-noted">
          <Icon name="note" size={16} tone="dim" />
          <Label>{noted === 1 ? '1 note' : `${String(noted)} notes`}</Label>
        </View>
      )}
    </View>
  );
}

export function TitleCell({ row, protocol }: { row: StepRowView; protocol: TargetSource | null }) {
  const mark = stepMark(row);
  return (
    <View className="min-w-0 flex-row items-start gap-2.5">
      <View className="pt-[3px]">
        <Icon name={mark.icon} size={15} tone={mark.tone === 'on-lamp' ? 'onLamp' : mark.tone} />
      </View>
      <View className="min-w-0 shrink">
        <Body>{stepTitle(row, protocol)}</Body>
        <Label className="font-mono">
          {row.path}
          {row.label === '' || row.kind === 'mark' ? '' : ` · ${row.label}`}
        </Label>
      </View>
    </View>
  );
}
