import { useMemo } from 'react';
import { Pressable, View } from 'react-native';
import { useLab } from '@/components/api';
import { readingAt } from '@/components/charts/reading';
import { TimePlot } from '@/components/charts/time-plot';
import { axisUnit, type TimePlotProps, type TimeSpan } from '@/components/charts/time-plot-types';
import { Body, Icon, Label, Num } from '@/components/ui';
import type { ChannelView, readSamples } from '@/shared/contracts/data';
import type { ResponseOf } from '@/shared/contracts/route';
import { uOfCalibrated } from '@/shared/statistics/calibration';
import { readingWords } from './reading-words';
import { useRunSamples } from './use-run-samples';

/** What all panes under the deflection are drawn with. */
export type Linked = Pick<TimePlotProps, 'view' | 'bands' | 'excluded' | 'marked' | 'painter' | 'onTap' | 'onKey' | 'keyWords'>;

export interface PlottedSeries {
  utcMs: ArrayLike<number>;
  value: ArrayLike<number>;
  unit: string;
  thinned: boolean;
  gapMs?: number | undefined;
  /** Standard uncertainty of a reading where it is known; else it is told by the scatter. */
  uAt?: ((utcMs: number) => number | null) | undefined;
  /** What the calibration leaves in a value beside its scatter; absent where none is known. */
  uOf?: ((value: number) => number) | undefined;
}

/** Values as the server calibrated them, with what the calibration leaves open. */
export function seriesOf({ utcMs, value, total, calibration }: ResponseOf<typeof readSamples>, unit: string): PlottedSeries {
  const uOf = calibration === null ? {} : { uOf: (one: number) => uOfCalibrated(calibration, one) };
  return { utcMs, value, unit, thinned: total > utcMs.length, ...uOf };
}

/** u of a reading by its scatter, with that of its calibration. */
const together = (scatter: number | null, calibration: number) => Math.hypot(scatter ?? 0, calibration);

/** What a series says under the cursor; nothing without one. */
export function useReadingWords(series: PlottedSeries | null, cursor: number | null): string {
  return useMemo(() => {
    if (series === null || cursor === null) return '';
    const { utcMs, value, unit, thinned, gapMs, uAt, uOf } = series;
    const reading = readingAt({ x: utcMs, y: value }, cursor, { thinned, gapMs });
    if (reading?.kind !== 'value') return readingWords(reading, unit);
    const byScatter = uOf === undefined ? reading.u : together(reading.u, uOf(reading.value));
    return readingWords({ ...reading, u: uAt === undefined ? byScatter : uAt(cursor) }, unit);
  }, [series, cursor]);
}

interface PaneProps {
  /** Stands in test names. */
  name: string;
  title: string;
  open: boolean;
  onToggle: () => void;
  /** Null while it is not there. */
  series: PlottedSeries | null;
  /** Said in place of a plot without samples. */
  empty: string;
  linked: Linked;
  heightPx: number;
}

/** A small plot under the deflection, moved and read out together with it; closed it is one line. */
export function Pane({ name, title, open, onToggle, series, empty, linked, heightPx }: PaneProps) {
  const { timeZone } = useLab();
  const words = useReadingWords(open ? series : null, linked.view.cursor);
  const has = series !== null && series.utcMs.length > 0;
  return (
    <View className="border-t border-line" testID={`pane-${name}`}>
      <Pressable
        role="button"
        aria-expanded={open}
        aria-label={`${title}, ${open ? 'shown' : 'not shown'}`}
        onPress={onToggle}
        className="min-h-target flex-row items-center gap-2 hover:bg-panel2"
        testID={`pane-toggle-${name}`}
      >
        <Icon name={open ? 'open' : 'forward'} size={16} tone="dim" />
        <Body className="min-w-0 shrink grow" numberOfLines={1}>
          {title}
          {series === null ? '' : `, ${axisUnit(series.unit)}`}
        </Body>
        {words === '' ? null : <Num testID={`pane-reading-${name}`}>{words}</Num>}
      </Pressable>
      {!open ? null : has ? (
        <TimePlot
          {...series}
          {...linked}
          timeZone={timeZone}
          title={`${title}, in step with the deflection`}
          axis={false}
          heightPx={heightPx}
        />
      ) : (
        <Label className="pb-3">{empty}</Label>
      )}
    </View>
  );
}

/** A pane of a channel that the rig records. */
export function ChannelPane({
  runId,
  channel,
  wanted,
  ...pane
}: Omit<PaneProps, 'name' | 'title' | 'series' | 'empty'> & { runId: string; channel: ChannelView; wanted: TimeSpan | null }) {
  const samples = useRunSamples(runId, channel.id, { span: wanted, enabled: pane.open });
  const data = samples.data?.data ?? null;
  const series = useMemo(() => (data === null ? null : seriesOf(data, channel.unit)), [data, channel.unit]);
  const empty = samples.isError ? 'It could not be loaded.' : samples.isPending ? 'Loading' : 'No samples in this time.';
  return <Pane {...pane} name={channel.name} title={channel.name} series={series} empty={empty} />;
}
