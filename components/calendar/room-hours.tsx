import { useRouter, type Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { fieldErrors, useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Check, Field, IconButton, Label, Panel, ProblemNotice, Section, Sheet } from '@/components/ui';
import { listRigs } from '@/shared/contracts/rigs';
import { changeRoomHours, readRoomHours } from '@/shared/contracts/schedules';
import type { RoomHours } from '@/shared/schedule/plan';
import { dayWords } from './nights';
import { useRefreshCalendar } from './use-refresh-calendar';

/** When the room of each rig is quiet, and when nothing may start. */
export function RoomHoursList() {
  const rigs = useLabQuery(listRigs).data?.data.items ?? [];
  return (
    <Section title="Hours of the rooms">
      {rigs.map((rig) => (
        <RoomPanel key={rig.id} rig={rig} />
      ))}
    </Section>
  );
}

function RoomPanel({ rig }: { rig: { id: string; name: string } }) {
  const mayEdit = useMay('rig.edit');
  const hours = useLabQuery(readRoomHours, { params: { rigId: rig.id } }).data?.data;
  const [editing, setEditing] = useState(false);
  const router = useRouter();
  return (
    <Panel className="gap-2" testID="room">
      <Body strong>{rig.name}</Body>
      {hours === undefined ? null : <HoursWords hours={hours} />}
      <View className="flex-row flex-wrap gap-2">
        {mayEdit.ok && hours !== undefined ? (
          <Button
            icon="edit"
            label="Change"
            accessibilityLabel={`Change the hours of ${rig.name}`}
            onPress={() => setEditing(true)}
            testID="change-hours"
          />
        ) : null}
        <Button
          icon="document"
          label="Door card"
          accessibilityLabel={`Door card of ${rig.name}`}
          onPress={() => router.push(`/rigs/${rig.id}/door` as Href)}
          testID="door-card-of"
        />
      </View>
      {editing && hours !== undefined ? <HoursSheet rig={rig} hours={hours} onClose={() => setEditing(false)} /> : null}
    </Panel>
  );
}

function HoursWords({ hours: { nightWindow, blackouts } }: { hours: RoomHours }) {
  return (
    <View className="gap-1">
      <Body size={13}>
        {nightWindow === null ? 'No night window: runs may go on at any time.' : `Night window ${nightWindow.from} to ${nightWindow.until}`}
      </Body>
      {blackouts.map(({ from, until, why }) => (
        <Label key={`${from} ${until} ${why}`}>
          {dayWords(from)}
          {until === from ? '' : ` to ${dayWords(until)}`}: {why}
        </Label>
      ))}
    </View>
  );
}

const usualWindow = { from: '20:00', until: '07:00' };

function HoursSheet({ rig, hours, onClose }: { rig: { id: string; name: string }; hours: RoomHours; onClose: () => void }) {
  const refresh = useRefreshCalendar();
  const [draft, setDraft] = useState(hours);
  const send = useLabMutation(changeRoomHours, () => {
    refresh();
    onClose();
  });
  const errors = fieldErrors(send.error);
  const { nightWindow, blackouts } = draft;
  const setBlackout = (at: number, change: Partial<RoomHours['blackouts'][number]>) =>
    setDraft({ ...draft, blackouts: blackouts.map((each, index) => (index === at ? { ...each, ...change } : each)) });
  return (
    <Sheet
      open
      title={`Hours of ${rig.name}`}
      onClose={onClose}
      testID="hours-sheet"
      footer={
        <Button
          kind="primary"
          size="action"
          label="Keep these hours"
          busy={send.isPending}
          onPress={() => send.mutate({ params: { rigId: rig.id }, body: draft })}
          testID="hours-confirm"
        />
      }
    >
      <Check
        label="Runs may go on only in a night window"
        value={nightWindow !== null}
        onChange={(on) => setDraft({ ...draft, nightWindow: on ? usualWindow : null })}
        testID="has-window"
      />
      {nightWindow === null ? null : (
        <View className="flex-row gap-3 *:flex-1">
          <Field
            label="From"
            type="time"
            value={nightWindow.from}
            onChange={(from) => setDraft({ ...draft, nightWindow: { ...nightWindow, from } })}
            error={errors['nightWindow.from']}
          />
          <Field
            label="Until"
            type="time"
            value={nightWindow.until}
            onChange={(until) => setDraft({ ...draft, nightWindow: { ...nightWindow, until } })}
            error={errors['nightWindow.until']}
          />
        </View>
      )}
      <Section
        title="Blackout dates"
        remark="Whole days, first and last included: no scheduled run begins on one, and none that would go on into it, as the night before."
      >
        {blackouts.map((blackout, index) => (
          <View key={index} className="gap-3 border-b border-line pb-3">
            <View className="flex-row items-end gap-3">
              <View className="flex-1">
                <Field
                  label="From"
                  type="date"
                  value={blackout.from}
                  onChange={(from) => setBlackout(index, { from })}
                  error={errors[`blackouts.${String(index)}.from`]}
                />
              </View>
              <View className="flex-1">
                <Field
                  label="Until"
                  type="date"
                  value={blackout.until}
                  onChange={(until) => setBlackout(index, { until })}
                  error={errors[`blackouts.${String(index)}.until`]}
                />
              </View>
              <IconButton
                icon="remove"
                label="Remove these days"
                onPress={() => setDraft({ ...draft, blackouts: blackouts.filter((_, at) => at !== index) })}
              />
            </View>
            <Field
              label="Why"
              value={blackout.why}
              onChange={(why) => setBlackout(index, { why })}
              error={errors[`blackouts.${String(index)}.why`]}
            />
          </View>
        ))}
        <Button
          icon="plus"
          label="Add days"
          onPress={() => setDraft({ ...draft, blackouts: [...blackouts, { from: '', until: '', why: '' }] })}
          testID="add-blackout"
        />
      </Section>
      {send.isError ? <ProblemNotice title="The hours were not kept" {...wordsOf(send.error)} /> : null}
    </Sheet>
  );
}
