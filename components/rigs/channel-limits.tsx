import { useQueryClient } from '@tanstack/react-query';
import { useState } from 'react';
import { View } from 'react-native';
import { fieldErrors, labKey, useLab, useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Field, IconButton, Label, Panel, ProblemNotice, Section, Select, Sheet, Tabs } from '@/components/ui';
import { readDecimal } from '@/components/ui/read-decimal';
import type { ChannelLimit } from '@/shared/alarms/limits';
import { addChannelLimit, listChannelLimits, removeChannelLimit, type ChannelLimitView } from '@/shared/contracts/alarms';
import { listChannels } from '@/shared/contracts/data';
import { formatDuration } from '@/shared/lib/format-duration';
import { limitOf, limitWords, windowProblem, type LimitDraft } from './limit-words';

/** What a channel may not pass without somebody hearing of it. */
export function ChannelLimits({ rigId }: { rigId: string }) {
  const list = useLabQuery(listChannelLimits, { params: { rigId } });
  const mayEdit = useMay('rig.edit');
  const [adding, setAdding] = useState(false);
  const items = list.data?.data.items ?? [];
  return (
    <Section
      title="Limits of channels"
      trailing={mayEdit.ok ? <Button kind="quiet" icon="plus" label="Add" onPress={() => setAdding(true)} testID="add-limit" /> : undefined}
    >
      <Panel className="gap-1 py-2" testID="channel-limits">
        {list.isError ? <ProblemNotice title="The limits could not be read" {...wordsOf(list.error)} /> : null}
        {list.data !== undefined && items.length === 0 ? (
          <Body tone="dim">None: no temperature, tilt or deflection raises an alarm by its value.</Body>
        ) : null}
        {items.map((item) => (
          <LimitRow key={item.id} rigId={rigId} item={item} mayEdit={mayEdit.ok} />
        ))}
      </Panel>
      {adding ? <LimitSheet rigId={rigId} onClose={() => setAdding(false)} /> : null}
    </Section>
  );
}

const useRefresh = () => {
  const { labId } = useLab();
  const queries = useQueryClient();
  return () => void queries.invalidateQueries({ queryKey: labKey(labId, listChannelLimits) });
};

const ringsWords = { allowed: 'rings', morning: 'told by day', never: 'on the screens only' } as const;

function LimitRow({ rigId, item, mayEdit }: { rigId: string; item: ChannelLimitView; mayEdit: boolean }) {
  const remove = useLabMutation(removeChannelLimit, useRefresh());
  const { limit, channelName, unit } = item;
  return (
    <View className="flex-row items-center gap-2 border-b border-line py-1 last:border-b-0">
      <View className="min-w-0 flex-1">
        <Body>
          {channelName}: {limitWords(limit, unit)}
        </Body>
        <Label>
          {'forS' in limit ? `for ${formatDuration(limit.forS)}, ` : ''}
          {ringsWords[limit.rings]}; by {item.changedBy}
        </Label>
        {remove.isError ? <ProblemNotice title="The limit stays" {...wordsOf(remove.error)} /> : null}
      </View>
      {mayEdit ? (
        <IconButton
          icon="remove"
          label={`Remove the limit of ${channelName}`}
          disabled={remove.isPending}
          onPress={() => remove.mutate({ params: { rigId, limitId: item.id } })}
        />
      ) : null}
    </View>
  );
}

const kindOptions = [
  { value: 'level', label: 'Level' },
  { value: 'slope', label: 'Slope' },
  { value: 'span', label: 'Span' },
  { value: 'silence', label: 'Silence' },
] as const;

const ringsOptions: readonly { value: ChannelLimit['rings']; label: string }[] = [
  { value: 'morning', label: 'Told by day, or in the morning' },
  { value: 'allowed', label: 'Rings whoever is on call, outside “do not ring”' },
  { value: 'never', label: 'On the screens only' },
];

/** Fields as they are typed, and where a refusal names them. */
const fieldPaths = {
  ...{ least: 'least', greatest: 'greatest', perH: 'greatestPerH', span: 'atMost', windowMin: 'windowS' },
  ...{ atMostS: 'atMostS', forS: 'forS' },
} as const;

function LimitSheet({ rigId, onClose }: { rigId: string; onClose: () => void }) {
  const channels = useLabQuery(listChannels, { params: { rigId } }).data?.data.items ?? [];
  const refresh = useRefresh();
  const [draft, setDraft] = useState<LimitDraft>({
    kind: 'level',
    least: '',
    greatest: '',
    perH: '',
    span: '',
    windowMin: '10',
    atMostS: '60',
    forS: '600',
    rings: 'morning',
  });
  const [chosen, setChosen] = useState('');
  const add = useLabMutation(addChannelLimit, () => {
    refresh();
    onClose();
  });
  const channelId = chosen === '' ? (channels[0]?.id ?? '') : chosen;
  const unit = channels.find(({ id }) => id === channelId)?.unit ?? '';
  const limit = limitOf(draft, readDecimal);
  const errors = fieldErrors(add.error);
  const field = (key: keyof typeof fieldPaths, label: string, shown: string) => (
    <Field
      label={label}
      type="number"
      unit={shown}
      value={draft[key]}
      onChange={(text) => setDraft({ ...draft, [key]: text })}
      error={(key === 'windowMin' ? windowProblem(draft, readDecimal) : undefined) ?? errors[`limit.${fieldPaths[key]}`]}
      testID={`limit-${key}`}
    />
  );
  return (
    <Sheet
      open
      title="A limit"
      onClose={onClose}
      testID="limit-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label="Set it"
          disabled={limit === null || channelId === ''}
          busy={add.isPending}
          onPress={() => (limit === null ? undefined : add.mutate({ params: { rigId }, body: { channelId, limit } }))}
          testID="limit-save"
        />
      }
    >
      {channels.length === 0 ? (
        <Body>The rig has no channel yet: it gets one with its first samples.</Body>
      ) : (
        <Select
          label="Channel"
          value={channelId}
          options={channels.map(({ id, name }) => ({ value: id, label: name }))}
          onChange={setChosen}
        />
      )}
      <Tabs label="Kind of limit" value={draft.kind} options={kindOptions} onChange={(kind) => setDraft({ ...draft, kind })} />
      {draft.kind === 'level' ? (
        <>
          {field('least', 'Not below (empty: no limit)', unit)}
          {field('greatest', 'Not above (empty: no limit)', unit)}
        </>
      ) : null}
      {draft.kind === 'slope' ? field('perH', 'Change at most, to either side', `${unit} an hour`) : null}
      {draft.kind === 'span' ? field('span', 'Greatest minus least at most', unit) : null}
      {draft.kind === 'slope' || draft.kind === 'span' ? field('windowMin', 'Looked at over the last', 'min') : null}
      {draft.kind === 'silence'
        ? field('atMostS', 'Longest time without a sample', 's')
        : field('forS', 'Only when it lasts longer than', 's')}
      <Select label="Whom it tells" value={draft.rings} options={ringsOptions} onChange={(rings) => setDraft({ ...draft, rings })} />
      <Label>It counts as over when it has come back by 2 % more than the limit. For deflection give at least one period.</Label>
      {add.isError ? <ProblemNotice title="The limit was not set" {...wordsOf(add.error)} /> : null}
    </Sheet>
  );
}
