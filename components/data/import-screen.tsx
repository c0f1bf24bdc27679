import { useLocalSearchParams, type Href } from 'expo-router';
import { View } from 'react-native';
import { useLab, useLabQuery, useMay, wordsOf } from '@/components/api';
import { TextLink } from '@/components/runs/recent-steps';
import { Body, Button, Empty, Field, Icon, Label, Loading, Panel, ProblemNotice, Screen, Section } from '@/components/ui';
import { readSamples } from '@/shared/contracts/data';
import { getRun, type RunView } from '@/shared/contracts/runs';
import { formatFixed } from '@/shared/lib/format-number';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { CheckPanel } from './check-panel';
import { FileDrop } from './file-drop';
import { FindingsPanel } from './findings-panel';
import { columnNames, previewRows, textOf } from './file-preview';
import { undecided } from './import-draft';
import { MappingForm } from './mapping-form';
import { PreviewTable } from './preview-table';
import { sizeWords, UnfinishedFiles, UploadPanel } from './upload-panel';
import { useImport, type StoredImport } from './use-import';

/** Brings deflection data of a run in from a text file. */
export function ImportScreen() {
  const { runId } = useLocalSearchParams<{ runId: string }>();
  const may = useMay('data.import');
  const run = useLabQuery(getRun, { params: { runId } });
  const samples = useLabQuery(readSamples, { params: { runId }, query: { points: 10 } });
  const back = { href: `/runs/${runId}/data` as Href, label: 'Deflection data' };
  const view = run.data?.data;
  const failed = run.error ?? samples.error;
  return (
    <Screen title="Import deflection" back={back} testID="import-screen">
      {!may.ok ? (
        <Empty title="Not yours to do">{may.why}</Empty>
      ) : failed !== null ? (
        <ProblemNotice title="The run could not be loaded" {...wordsOf(failed)} />
      ) : view === undefined || samples.data === undefined ? (
        <Loading />
      ) : (
        <ImportWork
          view={view}
          channelName={freeName(
            view,
            samples.data.data.channels.map(({ name }) => name),
          )}
        />
      )}
    </Screen>
  );
}

/** The registered channel's name while it is free, else one that says where the data come from. */
function freeName(view: RunView, taken: readonly string[]): string {
  const wanted = view.protocol.evaluation?.channel ?? 'deflection';
  return taken.includes(wanted) ? `${wanted}, imported` : wanted;
}

function ImportWork({ view, channelName }: { view: RunView; channelName: string }) {
  const { timeZone } = useLab();
  const work = useImport({ runId: view.id, rigId: view.rigId }, channelName);
  const { state, step, failure, stored, upload } = work;
  if (stored !== null) return <Stored runId={view.id} {...stored} onAnother={work.anotherFile} />;
  return (
    <View className="gap-4">
      {state.imported !== null && state.draft !== null ? (
        <ChosenFile work={work} view={view} />
      ) : upload !== null ? (
        <UploadPanel {...upload} onCancel={() => void work.cancel()} />
      ) : (
        <>
          <FileDrop onFile={(file) => void work.send(file)} busy={step === 'sending'} />
          <UnfinishedFiles files={work.unfinished} onThrowAway={(id) => void work.throwAway(id)} />
        </>
      )}
      {failure === null ? null : <ProblemNotice title={failure.title} detail={failure.detail} errors={failure.errors} />}
      {state.check === null ? null : (
        <>
          <CheckPanel check={state.check} timeZone={timeZone} />
          <FindingsPanel
            {...{ findings: state.check.findings, choices: state.choices, timeZone, channelName: state.channelName }}
            unit={state.draft?.unit ?? ''}
            onChoice={work.settle}
          />
        </>
      )}
      {state.draft === null ? null : <Acts work={work} />}
    </View>
  );
}

type Work = ReturnType<typeof useImport>;

function ChosenFile({ work, view }: { work: Work; view: RunView }) {
  const { timeZone } = useLab();
  const { state, head } = work;
  const { draft, imported } = state;
  if (draft === null || imported === null) return null;
  const rows = draft.delimiter === null ? (imported.preview?.rows ?? []) : previewRows(textOf(head, draft.encoding), draft.delimiter);
  const names = columnNames(rows, draft.headerRow === true);
  return (
    <View className="gap-4">
      <View className="flex-row items-center gap-3">
        <Icon name="document" tone="dim" />
        <View className="min-w-0 flex-1">
          <Body strong numberOfLines={1}>
            {imported.fileName}
          </Body>
          <Label>{sizeWords(imported.bytes)}</Label>
        </View>
        <Button kind="quiet" label="Another file" onPress={work.anotherFile} />
      </View>
      <PreviewTable
        rows={rows}
        names={names}
        headerRow={draft.headerRow === true}
        timeColumn={draft.timeColumn}
        valueColumn={draft.valueColumn}
      />
      <Section
        title="How to read it"
        remark={
          state.remembered === null
            ? 'Guessed from the file. What it does not tell stays open until you state it.'
            : `Filled in as ${state.remembered.usedBy} read a file with the same columns into ${state.remembered.channelName}, ${formatDayAndClock(Date.parse(state.remembered.usedAt), timeZone)}. Please look over it.`
        }
      >
        {state.remembered === null ? null : (
          <Button kind="quiet" label="Guess from the file instead" onPress={work.guess} className="self-start" testID="guess-mapping" />
        )}
        <MappingForm
          draft={draft}
          ambiguous={state.ambiguous}
          names={names}
          runStart={view.startedAt}
          timeZone={timeZone}
          onChange={work.change}
        />
      </Section>
      <View className="wide:w-[270px]">
        <Field
          label="Name of the channel"
          value={state.channelName}
          onChange={work.name}
          hint="The same name adds to a channel imported earlier."
          testID="channel-name"
        />
      </View>
    </View>
  );
}

function Acts({ work }: { work: Work }) {
  const { state, step, mapping } = work;
  const missing = mapping?.missing ?? [];
  const open = state.check === null ? [] : undecided(state.check, state.choices);
  const ready = state.check !== null && open.length === 0;
  return (
    <View className="gap-2">
      {missing.length === 0 ? null : <Label tone="text">Still to state: {missing.join(', ')}.</Label>}
      {open.length === 0 ? null : (
        <Label tone="text" testID="import-undecided">
          Nothing can be stored yet: {open.join(', ')}.
        </Label>
      )}
      <View className="flex-row flex-wrap gap-3">
        <Button
          kind={ready ? 'plain' : 'primary'}
          label={state.check === null ? 'Check the file' : 'Check again'}
          busy={step === 'checking'}
          disabled={missing.length > 0 || state.channelName.trim() === ''}
          onPress={() => void work.check()}
          testID="check-import"
        />
        {ready ? (
          <Button
            kind="primary"
            label="Store the samples"
            busy={step === 'storing'}
            onPress={() => void work.store()}
            testID="store-import"
          />
        ) : null}
      </View>
    </View>
  );
}

function Stored({
  runId,
  stored,
  known,
  other,
  leftOut,
  choices,
  channel,
  onAnother,
}: StoredImport & { runId: string; onAnother: () => void }) {
  const count = (number: number) => formatFixed(number, { decimals: 0 });
  return (
    <Panel edge="good" className="gap-3" testID="import-stored">
      <View role="status" className="flex-row items-center gap-2">
        <Icon name="passed" tone="good" />
        <Body strong className="shrink">
          {count(stored)} samples stored in {channel.name}
          {known > 0 ? `; ${count(known)} were there already` : ''}
          {other > 0 ? `, ${count(other)} with another value, which was ${choices.sameInstant === 'replace' ? 'replaced' : 'kept'}` : ''}
          {leftOut > 0 ? `; ${count(leftOut)} rows were left out` : ''}.
        </Body>
      </View>
      <View className="flex-row flex-wrap gap-2">
        <TextLink href={`/runs/${runId}/data?channel=${channel.id}`} label="See it against the steps" />
        <TextLink href={`/runs/${runId}/evaluation`} label="Evaluate" />
        <Button kind="quiet" label="Import another file" onPress={onAnother} />
      </View>
    </Panel>
  );
}
