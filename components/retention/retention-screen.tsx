import type { Href } from 'expo-router';
import { useState } from 'react';
import { View } from 'react-native';
import { serverNowMs, useLab, useLabQuery, useMay, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Body, IconButton, Label, Loading, Panel, ProblemNotice, Screen, Section } from '@/components/ui';
import { getRetention, type KeptChannel } from '@/shared/contracts/retention';
import { unitSign } from '@/shared/lib/format-number';
import { formatDay } from '@/shared/lib/format-time';
import { RetentionSheet, type KeptPlace } from './retention-sheet';
import { keepWords, ruleWords, thinnedWords } from './retention-words';

/** How long samples are kept at their full rate, by the lab and by each channel. */
export function RetentionScreen() {
  const { timeZone } = useLab();
  const query = useLabQuery(getRetention);
  const mayDecide = useMay('data.retention').ok;
  const [place, setPlace] = useState<KeptPlace | null>(null);
  const data = query.data?.data;
  return (
    <Screen title="How long samples are kept" back={{ href: '/lab' as Href, label: 'the lab' }} testID="retention-screen">
      <Body tone="dim">
        Samples older than the rule says are thinned to their summaries: least, greatest, mean and count of every 2&nbsp;s stay for ever,
        and plots go on showing every spike. What lies within a run, or an hour before or after it, always stays as it is.
      </Body>
      {query.isError ? <ProblemNotice title="The rules could not be read" {...wordsOf(query.error)} /> : null}
      {query.isPending ? <Loading label="Loading the rules" /> : null}
      {data === undefined ? null : (
        <>
          <Panel testID="lab-rule">
            <Row
              title="The lab"
              words={`${keepWords(data.lab?.keepDays ?? null)}, for every channel without a rule of its own`}
              more={data.lab === null ? null : `By ${data.lab.decidedBy}, ${formatDay(Date.parse(data.lab.decidedAt), timeZone)}.`}
              label="Change the rule of the lab"
              onEdit={mayDecide ? () => setPlace({ channelId: null, name: 'the lab', rule: data.lab }) : null}
            />
          </Panel>
          <Section title="Channels">
            <Panel className="gap-3" testID="kept-channels">
              {data.channels.length === 0 ? <Body tone="dim">No rig of the lab has a channel yet.</Body> : null}
              {data.channels.map((kept) => (
                <ChannelRow key={kept.channel.id} kept={kept} onEdit={mayDecide ? setPlace : null} />
              ))}
            </Panel>
          </Section>
          <MayNote act="data.retention" />
        </>
      )}
      {place === null ? null : <RetentionSheet place={place} onClose={() => setPlace(null)} />}
    </Screen>
  );
}

function ChannelRow({ kept, onEdit }: { kept: KeptChannel; onEdit: ((place: KeptPlace) => void) | null }) {
  const { timeZone } = useLab();
  const { channel, rigName, rule } = kept;
  const name = `${channel.name} of ${rigName}`;
  return (
    <Row
      title={`${rigName}: ${channel.name}, ${unitSign(channel.unit)}`}
      words={ruleWords(kept, { nowMs: serverNowMs(), timeZone })}
      more={thinnedWords(kept.thinned, timeZone)}
      label={`Change how long ${name} is kept`}
      onEdit={onEdit === null ? null : () => onEdit({ channelId: channel.id, name, rule })}
    />
  );
}

interface RowProps {
  title: string;
  words: string;
  more: string | null;
  label: string;
  onEdit: (() => void) | null;
}

function Row({ title, words, more, label, onEdit }: RowProps) {
  return (
    <View className="flex-row items-center gap-2" testID="kept-row">
      <View className="min-w-0 flex-1">
        <Body strong className="break-words">
          {title}
        </Body>
        <Body>{words}</Body>
        {more === null ? null : <Label>{more}</Label>}
      </View>
      {onEdit === null ? null : <IconButton icon="edit" label={label} onPress={onEdit} />}
    </View>
  );
}
