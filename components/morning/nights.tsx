import { Link, type Href } from 'expo-router';
import { View } from 'react-native';
import { UncertainText } from '@/components/evaluation/uncertain-text';
import { Body, Label, Num, Panel, Section } from '@/components/ui';
import type { MorningNight, MorningSheet } from '@/shared/contracts/morning';
import { formatDeflectionUncertain } from '@/shared/lib/format-angle';
import { formatPercent, formatSignificant } from '@/shared/lib/format-number';
import { formatDay } from '@/shared/lib/format-time';
import { formatUncertain } from '@/shared/lib/format-uncertain';
import { differenceInU, meanBefore, nightsTogether, qualityOf } from '@/shared/morning/earlier-nights';

const inMrad = ({ value, u }: MorningNight['reversal_rad']) => ({ value: value * 1e3, u: u === null ? null : u * 1e3 });

/** Near minus far of this night beside the nights before it and the control. */
export function NearFar({ sheet, rehearsal, timeZone }: { sheet: MorningSheet; rehearsal: boolean; timeZone: string }) {
  const { tonight, earlier } = sheet;
  if (tonight === null) return null;
  return (
    <Panel className="gap-1 !py-3" testID="near-far">
      <View className="flex-row flex-wrap items-baseline gap-x-3">
        <UncertainText size={20} {...inMrad(tonight.reversal_rad)} unit="mrad" options={{ exponent: 0 }} testID="reversal" />
        <Label>near − far, u from the scatter of the dwells</Label>
      </View>
      {earlier.length === 0 && !rehearsal ? <Label>The first evaluated night on this rig: nothing to compare it with yet.</Label> : null}
      {earlier.map((night) => (
        <EarlierNight key={night.runId} night={night} tonight={tonight} timeZone={timeZone} />
      ))}
      <NightsTogether tonight={tonight} earlier={earlier} />
    </Panel>
  );
}

/** What they come to, if nothing at the rig was changed between them: both ways to take more scatter than their u say, for they may differ. */
function NightsTogether({ tonight, earlier }: { tonight: MorningNight; earlier: readonly MorningNight[] }) {
  const together = nightsTogether(tonight, earlier);
  if (together === null) return null;
  const { nights, common, widenedU, own } = together;
  const ofOwn = `or ${formatDeflectionUncertain({ value: own.mean, u: own.u })} if each night has ${formatDeflectionUncertain({ value: own.scatter, u: own.scatterU })} of its own`;
  return (
    <View className="flex-row flex-wrap items-baseline gap-x-3" testID="nights-together">
      <Num size={13}>{formatDeflectionUncertain({ value: common.mean, u: widenedU })}</Num>
      <Label>
        {own.scatter === 0
          ? `${nights} nights together, which scatter no more than their u say`
          : `${nights} nights together, which scatter ${formatSignificant(widenedU / common.u, 2)} times as much as their u say: u is so much greater; ${ofOwn}`}
      </Label>
    </View>
  );
}

function EarlierNight({ night, tonight, timeZone }: { night: MorningNight; tonight: MorningNight; timeZone: string }) {
  const off = night.control !== tonight.control ? null : differenceInU(tonight.reversal_rad, night.reversal_rad);
  return (
    <View className="flex-row flex-wrap items-baseline gap-x-3">
      <Link href={`/runs/${night.runId}` as Href} className="underline">
        <Num size={13}>{formatDay(Date.parse(night.startedAt), timeZone)}</Num>
      </Link>
      <Num size={13}>{formatDeflectionUncertain(night.reversal_rad)}</Num>
      <Label>
        {night.control ? 'control, without sources' : off === null ? '' : `differs by ${formatSignificant(off, 2)} u of the difference`}
      </Label>
    </View>
  );
}

const inMicro = ({ value, u }: { value: number; u: number | null }) => ({
  value: value * 1e6,
  u: u === null ? null : u * 1e6,
  unit: 'µrad/h',
});

/** Period, quality and torsion constant of this night beside the mean of those before. */
export function Pendulum({ sheet: { tonight, earlier, drift } }: { sheet: MorningSheet }) {
  if (tonight?.period_s == null) return null;
  const nights = earlier.filter(({ control }) => !control);
  const before = (pick: Parameters<typeof meanBefore>[1]) => meanBefore(earlier, pick);
  const quality = qualityOf(tonight);
  return (
    <Section
      title="Pendulum"
      remark={
        nights.length === 0
          ? 'No earlier night to compare with.'
          : nights.length === 1
            ? 'Beside the night before.'
            : `Beside the mean of the last ${nights.length} nights.`
      }
    >
      <Panel className="flex-row flex-wrap gap-x-10 gap-y-3" testID="pendulum">
        <Beside label="damped period" now={{ ...tonight.period_s, unit: 's' }} before={before(({ period_s }) => period_s)} />
        {quality === null ? null : <Beside label="quality factor Q" now={{ ...quality, unit: '' }} before={before(qualityOf)} />}
        {tonight.kappa_N_m === null ? null : (
          <Beside
            label="torsion constant κ"
            now={{ ...tonight.kappa_N_m, unit: 'N.m/rad' }}
            before={before(({ kappa_N_m }) => kappa_N_m)}
          />
        )}
        {drift === null ? null : (
          <>
            <Beside label="drift of the zero at the start" now={inMicro(drift.start)} before={null} />
            <Beside label="drift of the zero at the end" now={inMicro(drift.end)} before={null} />
          </>
        )}
      </Panel>
    </Section>
  );
}

function Beside({ label, now, before }: { label: string; now: { value: number; u: number | null; unit: string }; before: number | null }) {
  const change = before === null ? null : now.value / before - 1;
  return (
    <View>
      <Body>{formatUncertain(now)}</Body>
      <Label>
        {label}
        {change === null ? '' : `, ${formatPercent(Math.abs(change))} ${change < 0 ? 'below' : 'above'} the mean`}
      </Label>
    </View>
  );
}
