import { useQueryClient } from '@tanstack/react-query';
import { useState } from 'react';
import { View } from 'react-native';
import { fieldErrors, labKey, useLab, useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import {
  Body,
  Button,
  Check,
  Chip,
  Field,
  IconButton,
  Label,
  Loading,
  Panel,
  ProblemNotice,
  Section,
  Select,
  Sheet,
} from '@/components/ui';
import type { CallSettings } from '@/shared/alarms/settings';
import { changeOnCall, getOnCall, type CallMember, type OnCall as OnCallView } from '@/shared/contracts/calls';

/** Who is on call: whom an alarm rings, one after the other. */
export function OnCall() {
  const query = useLabQuery(getOnCall);
  const mayChange = useMay('lab.settings').ok;
  const [open, setOpen] = useState(false);
  const data = query.data?.data;
  return (
    <Section
      title="On call"
      remark="Whom an alarm rings, one after the other until somebody acknowledges it."
      trailing={
        mayChange && data !== undefined ? (
          <IconButton icon="edit" label="Change who is on call" onPress={() => setOpen(true)} testID="change-on-call" />
        ) : undefined
      }
    >
      <Panel className="gap-2" testID="on-call">
        {query.isPending ? <Loading /> : null}
        {query.isError ? <ProblemNotice title="Who is on call could not be read" {...wordsOf(query.error)} /> : null}
        {data === undefined ? null : <Order data={data} />}
        <MayNote act="lab.settings" />
      </Panel>
      {open && data !== undefined ? <OnCallSheet data={data} onClose={() => setOpen(false)} /> : null}
    </Section>
  );
}

const memberOf = (data: OnCallView, userId: string): CallMember | undefined => data.members.find((member) => member.userId === userId);

function Order({ data }: { data: OnCallView }) {
  const { settings, members } = data;
  const ids =
    settings.order.length > 0
      ? settings.order.map(({ userId }) => userId)
      : members.filter(({ role }) => role === 'owner').map(({ userId }) => userId);
  return (
    <>
      {settings.starterFirst ? <Body>1. Whoever started the run</Body> : null}
      {ids.map((userId, index) => (
        <PersonLine key={userId} data={data} userId={userId} number={index + (settings.starterFirst ? 2 : 1)} />
      ))}
      <Label>
        The next after {settings.nextAfterMin} min; what can wait is told at {settings.morningAt}.
        {settings.order.length === 0 ? ' No order is set: the owners are rung.' : ''}
      </Label>
    </>
  );
}

function PersonLine({ data, userId, number }: { data: OnCallView; userId: string; number: number }) {
  const member = memberOf(data, userId);
  if (member === undefined) return null;
  const near = data.settings.order.find((one) => one.userId === userId)?.near === true;
  const hours = member.doNotRing === null ? '' : `do not ring ${member.doNotRing.from} to ${member.doNotRing.until}`;
  const push = member.devices === 0 ? 'by mail only' : 'by push and mail';
  return (
    <View className="flex-row items-center gap-3">
      <View className="min-w-0 flex-1">
        <Body>
          {number}. {member.name}
        </Body>
        <Label>{[push, hours].filter((words) => words !== '').join('; ')}</Label>
      </View>
      {near ? <Chip>near</Chip> : null}
    </View>
  );
}

function OnCallSheet({ data, onClose }: { data: OnCallView; onClose: () => void }) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const [draft, setDraft] = useState<CallSettings>(data.settings);
  const [minutes, setMinutes] = useState(String(data.settings.nextAfterMin));
  const save = useLabMutation(changeOnCall, () => {
    void queries.invalidateQueries({ queryKey: labKey(labId, getOnCall) });
    onClose();
  });
  const { order } = draft;
  const change = (next: CallSettings['order']) => setDraft({ ...draft, order: next });
  const swap = (index: number, by: number) => {
    const next = [...order];
    const [moved] = next.splice(index, 1);
    if (moved !== undefined) next.splice(index + by, 0, moved);
    change(next);
  };
  const left = data.members.filter(({ userId }) => !order.some((one) => one.userId === userId));
  const errors = fieldErrors(save.error);
  return (
    <Sheet
      open
      title="On call"
      onClose={onClose}
      testID="on-call-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label="Save"
          busy={save.isPending}
          onPress={() => save.mutate({ body: { ...draft, nextAfterMin: Number(minutes) } })}
          testID="on-call-save"
        />
      }
    >
      <Check
        label="Whoever started the run is rung first."
        value={draft.starterFirst}
        onChange={(starterFirst) => setDraft({ ...draft, starterFirst })}
      />
      {order.map(({ userId, near }, index) => (
        <View key={userId} className="border-b border-line pb-1" testID="on-call-person">
          <View className="flex-row items-center">
            <Body strong className="min-w-0 flex-1">
              {index + 1}. {memberOf(data, userId)?.name ?? 'no longer a member'}
            </Body>
            <IconButton icon="up" label="Earlier" disabled={index === 0} onPress={() => swap(index, -1)} />
            <IconButton icon="down" label="Later" disabled={index === order.length - 1} onPress={() => swap(index, 1)} />
            <IconButton icon="remove" label="Not on call" onPress={() => change(order.filter((one) => one.userId !== userId))} />
          </View>
          <Check
            label="Can be at the rig within half an hour."
            value={near}
            onChange={(is) => change(order.map((one) => (one.userId === userId ? { ...one, near: is } : one)))}
          />
        </View>
      ))}
      {left.length === 0 ? null : (
        <Select
          label="Add"
          value=""
          options={[
            { value: '', label: 'choose a member' },
            ...left.map(({ userId, name, role }) => ({ value: userId, label: `${name}, ${role}` })),
          ]}
          onChange={(userId) => (userId === '' ? undefined : change([...order, { userId, near: false }]))}
          testID="on-call-add"
        />
      )}
      <Field
        label="The next is rung after"
        type="number"
        unit="min"
        value={minutes}
        onChange={setMinutes}
        error={errors['nextAfterMin']}
        testID="next-after"
      />
      <Field
        label="What can wait is told at"
        type="time"
        value={draft.morningAt}
        onChange={(morningAt) => setDraft({ ...draft, morningAt })}
        error={errors['morningAt']}
      />
      {save.isError ? <ProblemNotice title="Nothing was changed" {...wordsOf(save.error)} /> : null}
    </Sheet>
  );
}
