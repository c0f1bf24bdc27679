import { useLocalSearchParams, type Href } from 'expo-router';
import { useMemo } from 'react';
import { View } from 'react-native';
import { wordsOf } from '@/components/api';
import { PlanView, TorquePlot } from '@/components/charts';
import { Body, Icon, Label, Loading, Num, Panel, ProblemNotice, Screen, Section } from '@/components/ui';
import { formatDegrees } from '@/shared/lib/format-angle';
import { formatPercent, formatSignificant, NARROW_SPACE } from '@/shared/lib/format-number';
import { formatUncertain, spokenUncertain } from '@/shared/lib/format-uncertain';
import { stationsFacts, type StationFacts, type StationsFacts } from '@/shared/planning/station-facts';
import { gapWords, stationWords } from '@/shared/planning/station-words';
import type { RigDocument } from '@/shared/rig/document';
import { useRig } from './use-rig';

/** Where the masses of a rig should stand and why: the torque over the turntable angle, and each station on it. */
export function StationsScreen() {
  const { rigId } = useLocalSearchParams<{ rigId: string }>();
  const query = useRig(rigId);
  const rig = query.data?.data;
  const back = { href: `/rigs/${rigId}` as Href, label: rig?.name ?? 'the rig' };
  return (
    <Screen title={`Stations of ${rig?.name ?? 'the rig'}`} back={back} testID="stations-screen">
      {query.isPending ? <Loading label="Loading the rig" /> : null}
      {query.isError ? (
        <ProblemNotice
          title="The rig could not be read"
          {...wordsOf(query.error)}
          action={{ label: 'Try again', onPress: () => void query.refetch() }}
        />
      ) : null}
      {rig === undefined ? null : <Stations document={rig.document} />}
    </Screen>
  );
}

function Stations({ document }: { document: RigDocument }) {
  const facts = useMemo(() => stationsFacts(document), [document]);
  if (facts === null)
    return (
      <Panel>
        <Body>
          Nothing on the turntable attracts the pendulum, or the travel limits and keep-out arcs leave no angle: there is no torque to show.
        </Body>
      </Panel>
    );
  return (
    <>
      <Section
        title="Torque over the turntable angle"
        remark="On the arm at its rest line. Shaded: where the masses may not stand. Dashed: the greatest torque within reach."
      >
        <TorquePlot facts={facts} />
      </Section>
      <Section title="Where the masses should stand">
        <Advice document={document} facts={facts} />
      </Section>
      <Section title="Each station">
        <View className="flex-row flex-wrap gap-3">
          {facts.stations.map((station) => (
            <StationPanel key={station.name} station={station} document={document} />
          ))}
        </View>
      </Section>
    </>
  );
}

function Advice({ document, facts }: { document: RigDocument; facts: StationsFacts }) {
  return (
    <Panel className="gap-3" testID="station-words">
      {stationWords(document, facts).map(({ kind, text }) => (
        <View key={text} className="flex-row items-start gap-2">
          <Icon name={kind === 'warning' ? 'warning' : 'note'} size={18} tone={kind === 'warning' ? 'lamp' : 'dim'} />
          <Body className="min-w-0 flex-1">{text}</Body>
        </View>
      ))}
    </Panel>
  );
}

const stateWords = { reached: null, 'kept out': 'kept out', touching: 'would touch a ball' } as const;

function StationPanel({ station, document }: { station: StationFacts; document: RigDocument }) {
  const { name, angleDeg, uDeg, torque, shareOfGreatest, perTenthDegree, gapM, state } = station;
  const inPico = { value: torque.value * 1e12, u: torque.u * 1e12, unit: `pN${NARROW_SPACE}m` };
  return (
    <Panel className="min-w-0 grow basis-[300px] gap-2" testID={`station-${name}`} edge={state === 'reached' ? undefined : 'danger'}>
      <View className="flex-row items-center gap-4">
        <PlanView rig={document} angleDeg={angleDeg} sizePx={72} />
        <View className="min-w-0 flex-1">
          <Body strong>{name}</Body>
          <Num>{formatUncertain({ value: angleDeg, u: uDeg, unit: 'deg' })}</Num>
          {stateWords[state] === null ? null : <Label tone="danger">{stateWords[state]}</Label>}
        </View>
      </View>
      <Fact label="torque" value={formatUncertain(inPico)} spoken={spokenUncertain(inPico)} />
      <Fact label="of the greatest within reach" value={formatPercent(shareOfGreatest, 3)} />
      <Fact
        label={`change for ${formatDegrees(0.1, 1)} more`}
        value={
          perTenthDegree === null
            ? 'no torque to change'
            : `${perTenthDegree > 0 ? '+' : ''}${formatSignificant(perTenthDegree * 100, 2)}${NARROW_SPACE}%`
        }
      />
      {gapM === null ? null : <Fact label="from source to ball" value={gapWords(gapM)} />}
    </Panel>
  );
}

function Fact({ label, value, spoken }: { label: string; value: string; spoken?: string }) {
  return (
    <View className="flex-row flex-wrap items-baseline justify-between gap-x-3">
      <Label>{label}</Label>
      <Num aria-label={spoken}>{value}</Num>
    </View>
  );
}
