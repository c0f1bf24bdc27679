import { useQueryClient } from '@tanstack/react-query';
import { useState } from 'react';
import { View } from 'react-native';
import { fieldErrors, labKey, useLab, useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Field, Icon, Label, Panel, ProblemNotice, Section } from '@/components/ui';
import { changeWatcher, getWatcher, type WatcherView } from '@/shared/contracts/calls';
import { formatClockWithZone } from '@/shared/lib/format-time';

/** For owners: the outside watcher that would notice a dead server. */
export function Watcher() {
  const mayChange = useMay('lab.settings').ok;
  const query = useLabQuery(getWatcher, { enabled: mayChange, everyMs: 30_000 });
  if (!mayChange) return null;
  const data = query.data?.data;
  return (
    <Section
      title="Sign of life"
      remark="A server that is dead tells nobody. A watcher outside hears each minute that it lives, and can ring when it does not."
    >
      <Panel className="gap-3" testID="watcher">
        {query.isError ? <ProblemNotice title="The watcher could not be read" {...wordsOf(query.error)} /> : null}
        {data === undefined ? null : <WatcherForm key={data.url ?? ''} watcher={data} />}
      </Panel>
    </Section>
  );
}

function WatcherForm({ watcher }: { watcher: WatcherView }) {
  const { labId, timeZone } = useLab();
  const queries = useQueryClient();
  const [url, setUrl] = useState(watcher.url ?? '');
  const save = useLabMutation(changeWatcher, () => void queries.invalidateQueries({ queryKey: labKey(labId, getWatcher) }));
  return (
    <>
      <Field
        label="Address that is called each minute"
        value={url}
        onChange={setUrl}
        mono
        placeholder="https://watch.example/ping/4711"
        error={fieldErrors(save.error)['url']}
        testID="watcher-url"
      />
      {watcher.lastAt === null ? null : (
        <View className="flex-row items-center gap-2">
          <Icon name={watcher.ok === true ? 'passed' : 'failed'} size={18} tone={watcher.ok === true ? 'good' : 'danger'} />
          <Label className="min-w-0 flex-1" testID="watcher-last">
            {formatClockWithZone(Date.parse(watcher.lastAt), { timeZone, precision: 'seconds' })}: {watcher.detail}
          </Label>
        </View>
      )}
      <View className="flex-row flex-wrap gap-2">
        <Button
          label={watcher.url === null ? 'Begin' : 'Change'}
          busy={save.isPending}
          disabled={url.trim() === '' || url.trim() === watcher.url}
          onPress={() => save.mutate({ body: { url: url.trim() } })}
          testID="watcher-save"
        />
        {watcher.url === null ? null : <Button kind="quiet" label="End it" onPress={() => save.mutate({ body: { url: null } })} />}
      </View>
      {watcher.url === null ? <Body tone="dim">None is sent.</Body> : null}
      {save.isError ? <ProblemNotice title="Nothing was changed" {...wordsOf(save.error)} /> : null}
    </>
  );
}
