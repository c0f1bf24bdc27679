import { View } from 'react-native';
import { useLab } from '@/components/api';
import { Body, Icon, Label, Num, Panel, Section } from '@/components/ui';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatFixed, formatPercent, formatSignificant, NARROW_SPACE } from '@/shared/lib/format-number';
import { formatClock } from '@/shared/lib/format-time';
import { formatUncertain } from '@/shared/lib/format-uncertain';
import { countOfOthers, heldPieces, usualLimits, type SpotBuffer } from '@/shared/spot/buffer';
import type { ReaderView } from './spot-reader';

const px = (value: number | null) => (value === null ? '–' : `${formatSignificant(value, 2)}${NARROW_SPACE}px`);

/** Position, rate, noise, and what became of the samples. */
export function LivePanel({ view, channel }: { view: ReaderView; channel: string }) {
  const { spot, figures, health, sender } = view;
  const last = health.recent.at(-1);
  return (
    <Section title="Now">
      <Panel className="gap-3" testID="spot-now">
        <Num size={30} light testID="spot-position">
          {positionWords(view)}
        </Num>
        <View className="flex-row flex-wrap gap-x-6 gap-y-2">
          <Fact name="Rate" value={`${formatFixed(figures.rateHz, { decimals: 1 })}${NARROW_SPACE}Hz`} testID="spot-rate" />
          <Fact name="Pictures missed" value={`${health.missed} of ${health.frames + health.missed}`} testID="spot-missed" />
          <Fact name="Noise, measured" value={px(figures.noisePx)} testID="spot-noise" />
          <Fact name="Noise, of the pixels" value={px(figures.uPx)} />
          <Fact name="Width at half height" value={px(spot?.widthPx ?? null)} />
          <Fact name="Brightest pixel" value={last === undefined ? '–' : formatPercent(last.brightest / 255)} />
          <Fact
            name="Server's time"
            value={view.clockUMs === null ? 'not known' : `± ${formatSignificant(view.clockUMs, 2)}${NARROW_SPACE}ms`}
          />
          <Fact name="Stored" value={`${sender.buffer.stored} samples`} testID="spot-stored" />
          <Fact name="Waiting" value={`${sender.buffer.held} samples`} testID="spot-waiting" />
          <Fact name="Of them on the device" value={`${sender.kept} samples`} testID="spot-kept" />
        </View>
        <SenderWords view={view} channel={channel} />
      </Panel>
      <Warnings warnings={view.warnings} />
    </Section>
  );
}

export function positionWords({ spot, camera }: Pick<ReaderView, 'spot' | 'camera'>): string {
  if (camera.kind !== 'open') return camera.kind === 'lost' ? 'camera away' : 'no camera';
  if (spot === null) return 'no spot';
  return spot.mm === null
    ? formatUncertain({ value: spot.px, u: spot.uPx, unit: 'px' })
    : formatUncertain({ value: spot.mm, u: spot.uMm, unit: 'mm' });
}

function Fact({ name, value, testID }: { name: string; value: string; testID?: string }) {
  return (
    <View className="min-w-[120px]">
      <Label>{name}</Label>
      <Num testID={testID}>{value}</Num>
    </View>
  );
}

/** What the network did to the samples, and where there are gaps. */
function SenderWords({ view: { sender, gaps }, channel }: { view: ReaderView; channel: string }) {
  const { timeZone } = useLab();
  const clock = (utcMs: number) => formatClock(utcMs, { timeZone, precision: 'seconds' });
  const { dropped, held } = sender.buffer;
  return (
    <>
      {sender.trouble === null ? null : (
        <Body role="status" tone="danger" testID="spot-trouble">
          Not stored yet: {sender.trouble} {held} samples wait on this {sender.unkept === null ? 'device' : 'page'} and are sent again; it
          holds {formatFixed(usualLimits.most, { decimals: 0 })} of them, {holdsWords}. Then the oldest go.
        </Body>
      )}
      {sender.unkept === null ? null : (
        <Body role="status" tone="danger" testID="spot-unkept">
          This browser keeps nothing on the device ({sender.unkept}): what waits is lost when the page is closed. Open it in a usual window,
          not a private one, and make room on the disk.
        </Body>
      )}
      {sender.found === 0 ? null : (
        <Label testID="spot-found">A page before this one left {sender.found} samples on this device; they are sent first.</Label>
      )}
      <OfOthers buffer={sender.buffer} channel={channel} />
      {dropped === null ? null : (
        <Body role="status" tone="danger" testID="spot-dropped">
          {dropped.count} samples between {clock(dropped.fromUtcMs)} and {clock(dropped.toUtcMs)} were dropped
          {sender.refused === null ? ': the server was away for longer than this device holds' : `: ${sender.refused}`}
        </Body>
      )}
      {gaps.length === 0 ? null : (
        <Label testID="spot-gaps">
          Nothing was read{' '}
          {gaps.map(({ fromUtcMs, toUtcMs }) => `for ${formatDuration((toUtcMs - fromUtcMs) / 1000)} until ${clock(toUtcMs)}`).join(', ')}.
        </Label>
      )}
    </>
  );
}

/** What waits for another channel than the one that is chosen. */
function OfOthers({ buffer, channel }: { buffer: SpotBuffer; channel: string }) {
  const count = countOfOthers(buffer, channel);
  if (count === 0) return null;
  const names = [...new Set(heldPieces(buffer).map((piece) => piece.channel))].filter((name) => name !== channel);
  return (
    <Body role="status" testID="spot-others">
      {count} samples of {names.join(', ')} wait until that channel is chosen again, with a token that may fill it.
    </Body>
  );
}

const holdsWords = `twelve hours at 10${NARROW_SPACE}Hz`;

/** What whoever is at the device should do before leaving it alone. */
export function Warnings({ warnings }: { warnings: readonly string[] }) {
  if (warnings.length === 0) return null;
  return (
    <Panel edge="lamp" className="gap-2" testID="spot-warnings">
      {warnings.map((text) => (
        <View key={text} className="flex-row items-start gap-2">
          <Icon name="warning" size={18} tone="lamp" />
          <Body className="min-w-0 flex-1">{text}</Body>
        </View>
      ))}
    </Panel>
  );
}
