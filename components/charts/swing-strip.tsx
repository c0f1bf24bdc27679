import { memo, useMemo } from 'react';
import { Pressable, View, type GestureResponderEvent } from 'react-native';
import { Label } from '@/components/ui';
import { formatClock, zoneName } from '@/shared/lib/format-time';
import type { Series } from './curve';
import { HiddenTable } from './hidden-table';
import { StripDrawing } from './strip-drawing';
import { layoutStrip, stepAt, wholeWindow, type StripWindow } from './strip-geometry';
import type { StripStep } from './strip-model';
import { stripRows, stripSummary } from './strip-summary';
import { useWidth } from './use-width';

export interface SwingStripProps {
  steps: readonly StripStep[];
  timeZone: string;
  /** What the strip shows, for those who do not see it: `North bench, tonight`. */
  title: string;
  /** Part of the time that is shown; the whole when absent. */
  window?: StripWindow | undefined;
  /** x in UTC ms, y in rad; a longer step than usual is drawn as the gap it is. */
  measured?: Series | null | undefined;
  predicted?: Series | null | undefined;
  /** Predicted equilibrium angle over time. */
  equilibrium?: Series | null | undefined;
  nowUtcMs?: number | null | undefined;
  selectedKey?: string | null | undefined;
  /** Makes the strip answer to taps and to the arrow keys. */
  onSelect?: ((key: string) => void) | undefined;
  /** `mini`: lanes and curve only, for lists. */
  size?: 'full' | 'mini' | undefined;
  heightPx?: number | undefined;
  /** Clock times under a full strip. */
  axis?: boolean | undefined;
}

/**
 * The swing strip: when the sources stand near (upper lane, marks up) and far (lower lane, marks down), how they swing,
 * and how the pendulum answers: measured solid, predicted fainter, equilibria dashed, now in lamp amber.
 */
export const SwingStrip = memo(function SwingStrip(props: SwingStripProps) {
  const { steps, timeZone, title, measured, predicted, equilibrium, nowUtcMs, selectedKey, onSelect, size = 'full' } = props;
  const mini = size === 'mini';
  const heightPx = props.heightPx ?? (mini ? 44 : 150);
  const lanePx = mini ? 7 : 18;
  const { width, onLayout } = useWidth(mini ? 160 : 340);
  const window = useMemo(() => props.window ?? wholeWindow(steps), [props.window, steps]);
  const layout = useMemo(
    () => layoutStrip({ steps, window, widthPx: width, heightPx, lanePx, measured, predicted, equilibrium, nowUtcMs, selectedKey }),
    [steps, window, width, heightPx, lanePx, measured, predicted, equilibrium, nowUtcMs, selectedKey],
  );
  const hasMeasured = (measured?.x.length ?? 0) > 0;
  // The words change only when another step begins: the table of a long run is not made anew with every look at the clock.
  const begunUtcMs = nowUtcMs == null ? nowUtcMs : (steps.findLast((step) => step.startUtcMs <= nowUtcMs)?.startUtcMs ?? 0);
  const words = useMemo(() => ({ steps, timeZone, nowUtcMs: begunUtcMs, hasMeasured }), [steps, timeZone, begunUtcMs, hasMeasured]);
  const summary = useMemo(() => stripSummary(words), [words]);
  const picture = (
    <View role="img" aria-label={`${title}: ${summary}`} style={{ height: heightPx }}>
      <StripDrawing layout={layout} widthPx={width} heightPx={heightPx} mini={mini} />
    </View>
  );
  return (
    <View onLayout={onLayout} className="w-full min-w-0" testID="swing-strip">
      {onSelect === undefined ? (
        picture
      ) : (
        <Selectable {...{ title, steps, selectedKey, onSelect }} pxToX={layout.pxToX} picture={picture} />
      )}
      {mini || props.axis === false ? null : <Axis window={window} timeZone={timeZone} />}
      {mini ? null : <StripTable title={title} words={words} />}
    </View>
  );
});

function Axis({ window, timeZone }: { window: StripWindow; timeZone: string }) {
  const clock = (utcMs: number) =>
    formatClock(utcMs, { timeZone, precision: window.toUtcMs - window.fromUtcMs < 600_000 ? 'seconds' : 'short' });
  return (
    <View className="flex-row items-baseline justify-between gap-2 pt-1.5" aria-hidden>
      <Label className="font-mono tabular">{clock(window.fromUtcMs)}</Label>
      <Label numberOfLines={1} className="shrink">
        {zoneName(timeZone)}
      </Label>
      <Label className="font-mono tabular">{clock(window.toUtcMs)}</Label>
    </View>
  );
}

const StripTable = memo(function StripTable({ title, words }: { title: string; words: Parameters<typeof stripRows>[0] }) {
  const { rows, left } = useMemo(() => stripRows(words), [words]);
  const columns = ['Step', 'Starts', 'Lasts', 'Turntable', 'State'];
  return (
    <HiddenTable
      caption={`${title}, step by step, times in ${zoneName(words.timeZone)}`}
      columns={columns}
      rows={rows.map((row) => [row.step, row.start, row.length, row.angle, row.state])}
      remark={left > 0 ? `${left} more steps are not listed here.` : undefined}
    />
  );
});

interface SelectableProps extends Pick<SwingStripProps, 'title' | 'steps' | 'selectedKey'> {
  onSelect: (key: string) => void;
  pxToX: (px: number) => number;
  picture: React.ReactNode;
}

function Selectable({ title, steps, selectedKey, onSelect, pxToX, picture }: SelectableProps) {
  const tapped = (event: GestureResponderEvent) => {
    const step = stepAt(steps, pxToX(event.nativeEvent.locationX));
    if (step) onSelect(step.key);
  };
  const move = (by: number) => {
    const at = steps.findIndex((step) => step.key === selectedKey);
    const next = steps[Math.min(steps.length - 1, Math.max(0, at + by))];
    if (next) onSelect(next.key);
  };
  const keys = {
    onKeyDown: (event: { key: string; preventDefault: () => void }) => {
      if (event.key !== 'ArrowRight' && event.key !== 'ArrowLeft') return;
      event.preventDefault();
      move(event.key === 'ArrowRight' ? 1 : -1);
    },
  };
  return (
    <Pressable
      role="button"
      aria-label={`${title}: choose a step, arrow keys move`}
      onPress={tapped}
      {...keys}
      style={{ cursor: 'pointer' }}
    >
      {picture}
    </Pressable>
  );
}
