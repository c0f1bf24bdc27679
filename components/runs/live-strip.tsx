import { useMemo, useState } from 'react';
import { View } from 'react-native';
import { nowWindow, SwingStrip, wholeWindow } from '@/components/charts';
import { Button, Label, Num, Panel, useWide } from '@/components/ui';
import { deflectionParts } from '@/shared/lib/format-angle';
import { formatClock } from '@/shared/lib/format-time';
import type { RunStrip } from './use-run-strip';

interface LiveStripProps {
  strip: RunStrip;
  timeZone: string;
  serverNowMs: number;
  title: string;
  lost: boolean;
}

/** How often the strip moves on, ms: less than a pixel, and a phone that shows a run all night draws it anew only as often. */
const strideMs = 2000;

/** The strip of a running run around the present, or the whole night. */
export function LiveStrip({ strip, timeZone, serverNowMs, title, lost }: LiveStripProps) {
  const wide = useWide();
  const [whole, setWhole] = useState(false);
  const { steps } = strip;
  const nowUtcMs = Math.floor(serverNowMs / strideMs) * strideMs;
  const window = useMemo(() => (whole ? wholeWindow(steps) : nowWindow(steps, nowUtcMs, wide ? 6 : 3)), [whole, steps, nowUtcMs, wide]);
  const reading = deflectionParts(strip.newestRad);
  return (
    <Panel className="gap-2" testID="live-strip">
      <View className="flex-row items-center justify-between gap-3">
        <Label className="shrink">
          Deflection{strip.measured === null ? ': no data yet' : wide ? ': solid measured, faint predicted' : ''}
        </Label>
        <Num size={17} tone={lost ? 'dim' : 'text'} aside={reading.unit} testID="deflection-now">
          {reading.number}
        </Num>
      </View>
      <SwingStrip
        steps={steps}
        timeZone={timeZone}
        title={title}
        window={window}
        measured={strip.measured}
        predicted={strip.predicted}
        equilibrium={strip.equilibrium}
        nowUtcMs={nowUtcMs}
        heightPx={wide ? 210 : 150}
        axis={false}
      />
      <View className="-mb-3 flex-row items-center justify-between gap-2">
        <Num size={13} tone="dim" aria-hidden>
          {formatClock(window.fromUtcMs, { timeZone })}
        </Num>
        <Button kind="quiet" label={whole ? 'Show now' : 'Show the whole run'} onPress={() => setWhole(!whole)} />
        <Num size={13} tone="dim" aria-hidden>
          {formatClock(window.toUtcMs, { timeZone })}
        </Num>
      </View>
    </Panel>
  );
}
