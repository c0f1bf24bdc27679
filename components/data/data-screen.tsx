import { router, useLocalSearchParams, type Href } from 'expo-router';
import { View } from 'react-native';
import { useLabQuery, useMay, wordsOf } from '@/components/api';
import { Button, Empty, Label, Loading, Panel, ProblemNotice, Screen, Section, Select } from '@/components/ui';
import { readSamples } from '@/shared/contracts/data';
import { unitSign } from '@/shared/lib/format-number';
import { ExclusionList, useExclusions, type Exclusions } from './exclusion-list';
import { KeptFiles } from './kept-files';
import { RunPlots } from './run-plots';

/** The whole run is asked for by few points: which channels it has, and which of them counts. */
const points = 10;

/** The deflection of a run against the steps that moved the masses, as close as one likes. */
export function DataScreen() {
  const { runId, channel: asked } = useLocalSearchParams<{ runId: string; channel?: string }>();
  const may = useMay('data.import');
  const whole = useLabQuery(readSamples, { params: { runId }, query: { points } });
  const known = whole.data?.data.channels ?? [];
  const channels = known.filter(({ role }) => role === 'deflection');
  const others = known.filter(({ role }) => role !== 'deflection');
  const channel = channels.find(({ id }) => id === asked) ?? whole.data?.data.channel ?? null;
  const exclusions = useExclusions(runId);
  const toImport = () => router.push(`/runs/${runId}/import` as Href);
  return (
    <Screen title="Deflection data" back={{ href: `/runs/${runId}` as Href, label: 'the run' }} testID="data-screen">
      {whole.isPending ? <Loading label="Loading the data" /> : null}
      {whole.isError ? (
        <ProblemNotice
          title="The data could not be loaded"
          detail={wordsOf(whole.error).detail}
          action={{ label: 'Try again', onPress: () => void whole.refetch() }}
        />
      ) : null}
      {whole.isSuccess && channels.length === 0 ? (
        <Empty
          title="No deflection data"
          icon="runs"
          action={may.ok ? { label: 'Import a file', icon: 'import', onPress: toImport } : undefined}
        >
          {may.ok ? 'Bring in the readings of the balance as a text file; they are laid against the step log.' : may.why}
        </Empty>
      ) : null}
      {channel === null || channels.length === 0 ? null : (
        <>
          {channels.length > 1 ? (
            <View className="wide:w-[320px]">
              <Select
                label="Channel"
                value={channel.id}
                options={channels.map(({ id, name, unit }) => ({ value: id, label: `${name}, ${unitSign(unit)}` }))}
                onChange={(id) => router.setParams({ channel: id })}
                testID="channel"
              />
            </View>
          ) : null}
          <RunPlots key={channel.id} {...{ runId, channel, others, exclusions }} />
          <Excluded runId={runId} exclusions={exclusions} />
          <KeptFiles runId={runId} channels={channels} />
          <Button icon="import" label="Import a file" disabled={!may.ok} onPress={toImport} className="self-start" testID="to-import" />
          {may.ok ? null : <Label>{may.why}</Label>}
        </>
      )}
    </Screen>
  );
}

/** What evaluations do without, and where more can be excluded. */
function Excluded({ runId, exclusions }: { runId: string; exclusions: Exclusions }) {
  return (
    <Section
      title="Excluded by hand"
      remark="Mark a stretch of the plot, or open a row of the step log, and give a reason. Evaluations asked for afterwards do without these samples."
    >
      {exclusions.exclusions.length === 0 && exclusions.error === null ? (
        <Label testID="nothing-excluded">Nothing is or was excluded.</Label>
      ) : (
        <Panel>
          <ExclusionList {...exclusions} />
        </Panel>
      )}
      <Button label="Step log" onPress={() => router.push(`/runs/${runId}/log` as Href)} className="self-start" testID="to-log" />
    </Section>
  );
}
