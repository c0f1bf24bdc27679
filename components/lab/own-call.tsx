import { useQueryClient } from '@tanstack/react-query';
import { useState } from 'react';
import { View } from 'react-native';
import { fieldErrors, labKey, useLab, useLabMutation, useLabQuery, wordsOf } from '@/components/api';
import { Body, Button, Field, Label, Panel, ProblemNotice, Section, useToast } from '@/components/ui';
import { Switch } from '@/components/ui/switch';
import type { OwnCall as OwnCallSettings } from '@/shared/alarms/settings';
import { changeOwnCall, getOnCall, tryCall } from '@/shared/contracts/calls';
import { zoneName } from '@/shared/lib/format-time';
import { PushDevices } from './push-devices';

const usual = { from: '22:00', until: '07:00' };

/** How I am reached, and when not. */
export function OwnCall() {
  const query = useLabQuery(getOnCall);
  const own = query.data?.data.own;
  return (
    <Section title="Ringing me">
      <Panel className="gap-4">
        {own === undefined ? null : <Hours key={JSON.stringify(own)} own={own} />}
        <PushDevices />
        <Trial />
      </Panel>
    </Section>
  );
}

function Hours({ own }: { own: OwnCallSettings }) {
  const { labId, timeZone } = useLab();
  const queries = useQueryClient();
  const toast = useToast();
  const [hours, setHours] = useState(own.doNotRing);
  const save = useLabMutation(changeOwnCall, () => {
    void queries.invalidateQueries({ queryKey: labKey(labId, getOnCall) });
    toast.show({ text: 'Kept.' });
  });
  const changed = JSON.stringify(hours) !== JSON.stringify(own.doNotRing);
  const errors = fieldErrors(save.error);
  return (
    <View className="gap-3">
      <Switch
        label="Do not ring me in some hours"
        value={hours !== null}
        onChange={(on) => setHours(on ? usual : null)}
        hint="An alarm that must wake somebody rings all the same when nobody else is left."
        testID="do-not-ring"
      />
      {hours === null ? null : (
        <View className="flex-row flex-wrap items-end gap-3">
          <Field label="From" type="time" value={hours.from} onChange={(from) => setHours({ ...hours, from })} testID="do-not-ring-from" />
          <Field
            label="Until"
            type="time"
            value={hours.until}
            onChange={(until) => setHours({ ...hours, until })}
            error={errors['doNotRing.until']}
          />
          <Label className="pb-3">{zoneName(timeZone)}</Label>
        </View>
      )}
      {changed ? (
        <Button
          label="Keep these hours"
          busy={save.isPending}
          onPress={() => save.mutate({ body: { doNotRing: hours } })}
          testID="keep-hours"
        />
      ) : null}
      {save.isError ? <ProblemNotice title="The hours were not kept" {...wordsOf(save.error)} /> : null}
    </View>
  );
}

const outcomeWords = { sent: 'sent', failed: 'failed', 'not-set-up': 'not set up' } as const;
const meansWords = { push: 'Push', mail: 'Mail', none: 'Nothing' } as const;

/** Sends a message as an alarm would, and says what became of it. */
function Trial() {
  const trial = useLabMutation(tryCall);
  const items = trial.data?.data.items ?? [];
  return (
    <View className="gap-2">
      <Button label="Send me a trial" icon="mail" busy={trial.isPending} onPress={() => trial.mutate({})} testID="try-call" />
      {items.length === 0 ? null : (
        <View role="status" testID="trial">
          {items.map(({ means, outcome, detail }, index) => (
            <Body key={index} size={13}>
              {meansWords[means]}: {outcomeWords[outcome]}
              {detail === '' ? '' : `, ${detail}`}
            </Body>
          ))}
        </View>
      )}
      {trial.isError ? <ProblemNotice title="No trial was sent" {...wordsOf(trial.error)} /> : null}
    </View>
  );
}
