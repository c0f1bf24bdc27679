import { useMemo, useState } from 'react';
import { View } from 'react-native';
import { Body, Field, Label, Num, Panel, Section } from '@/components/ui';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatPercent } from '@/shared/lib/format-number';
import { adviseNight } from '@/shared/planning/advise-night';
import { pairsToReach, type NightForecast } from '@/shared/planning/night-forecast';
import type { RigDocument } from '@/shared/rig/document';
import { dwellWords, pairsOf, readWantedU, sourceLines, strategyLines } from './night-words';
import type { Plan } from './plan';

const shownSources = 4;

/** u of G after the night by source, what the dwells cost, other ways of spending the hours, and what a wanted u would take. */
export function NightPanel({ forecast, plan, rig }: { forecast: NightForecast; plan: Plan; rig: RigDocument }) {
  const { predicted, cadence } = forecast;
  const peakRad = useMemo(() => (plan.predicted === null ? null : plan.predicted.y.reduce((a, y) => Math.max(a, Math.abs(y)), 0)), [plan]);
  return (
    <Section title="What the night gives" remark="By the noise and the stated u of the rig; every u is a standard uncertainty.">
      <Panel className="gap-5" testID="night-panel">
        <View>
          <Num size={24} light testID="predicted-u">
            {formatPercent(predicted.relativeU)}
          </Num>
          <Label>
            of G: u after {pairsOf(cadence.dwells)} at a beat of {formatDuration(cadence.cycleS)}
          </Label>
        </View>
        <Sources forecast={forecast} />
        <Body>{dwellWords(forecast)}</Body>
        {adviseNight(rig, { predicted, peakRad }).map(({ message }) => (
          <Body key={message}>{message}</Body>
        ))}
        {peakRad === null ? null : <Label>The pendulum swings out to {(peakRad * 1e3).toPrecision(2)} mrad at most.</Label>}
        <Strategies forecast={forecast} />
        <Wanted forecast={forecast} rig={rig} />
      </Panel>
    </Section>
  );
}

function Sources({ forecast }: { forecast: NightForecast }) {
  return (
    <View role="list" className="gap-3" aria-label="Greatest sources of u(G)">
      {sourceLines(forecast, shownSources).map(({ name, u, share }, index) => (
        <View key={name} role="listitem" className="gap-1">
          <View className="flex-row items-baseline justify-between gap-3">
            <Body strong={index === 0} className="shrink">
              {name}
            </Body>
            <Num strong={index === 0}>{u}</Num>
          </View>
          <View className="h-2 overflow-hidden rounded-full bg-panel2" aria-hidden>
            <View
              className={`h-2 rounded-full ${index === 0 ? 'bg-lamp' : 'bg-faint'}`}
              style={{ width: `${Math.max(0.6, share * 100)}%` }}
            />
          </View>
        </View>
      ))}
    </View>
  );
}

function Strategies({ forecast }: { forecast: NightForecast }) {
  const lines = strategyLines(forecast);
  if (lines.length === 0) return null;
  return (
    <View className="gap-3" role="list" aria-label="The same hours otherwise" testID="strategies">
      <Label>The same hours otherwise, u(G) of each at its best</Label>
      {lines.map(({ name, under, u, best }) => (
        <View key={name} role="listitem" className="flex-row items-start justify-between gap-3">
          <View className="min-w-0 flex-1">
            <Body strong={best}>{name}</Body>
            <Label>{best ? `${under}; least noise` : under}</Label>
          </View>
          <Num strong={best}>{u}</Num>
        </View>
      ))}
    </View>
  );
}

/** How many pairs a wanted u(G) takes at the beat of the plan. */
function Wanted({ forecast: { cadence }, rig }: { forecast: NightForecast; rig: RigDocument }) {
  const [text, setText] = useState('');
  const wanted = readWantedU(text);
  const share = wanted !== null && 'share' in wanted ? wanted.share : null;
  const pairs = useMemo(() => (share === null ? null : pairsToReach(rig, cadence, share)), [rig, cadence, share]);
  return (
    <View className="gap-2">
      <Field
        label="Wanted u(G)/G"
        mono
        unit="%"
        value={text}
        onChange={setText}
        error={wanted !== null && 'wrong' in wanted ? wanted.wrong : undefined}
        testID="wanted-u"
      />
      <Body role="status" testID="wanted-pairs">
        {share === null
          ? 'Tells how many pairs it takes at the beat of this plan.'
          : pairs === null
            ? 'No number of pairs comes so far: what the rig\u2019s own u leave open is more. Measure the greatest source better.'
            : `${pairsOf(2 * pairs)} at this beat, ${formatDuration(2 * pairs * cadence.cycleS)} of swinging and dwelling.`}
      </Body>
    </View>
  );
}
