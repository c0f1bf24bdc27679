import { useQueryClient } from '@tanstack/react-query';
import { View } from 'react-native';
import { labKey, useLab, useLabMutation, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Label, Panel, ProblemNotice, Section, useToast } from '@/components/ui';
import { listGivenUpJobs, retryJob, type GivenUpJob } from '@/shared/contracts/work';
import { formatDayAndClock } from '@/shared/lib/format-time';

const kinds: Readonly<Record<string, string>> = {
  'mail.invitation': 'Invitation mail',
  'mail.password-reset': 'Mail for a new password',
  'mail.password-changed': 'Mail about a changed password',
  'mail.schedule': 'Mail about a scheduled start',
  'run.notice': 'Message about a run',
  'alarm.ring': 'Ringing for an alarm',
  'alarm.over': 'Message that an alarm is over',
  'alarm.tell': 'Alarms of the morning',
  'samples.thin': 'Thinning of old samples',
  evaluate: 'Evaluation of a run',
  rehearse: 'Rehearsal',
};

/** For owners: what the server tried in vain, and why. Nothing is shown while there is nothing. */
export function GivenUpJobs() {
  const mayRead = useMay('lab.settings').ok;
  const list = useLabQuery(listGivenUpJobs, { enabled: mayRead });
  const items = list.data?.data.items ?? [];
  if (!mayRead || (items.length === 0 && !list.isError)) return null;
  return (
    <Section title="Given-up jobs" remark="Work that failed again and again in the last 30 days.">
      {list.isError ? <ProblemNotice title="Given-up jobs could not be read" {...wordsOf(list.error)} /> : null}
      {items.map((job) => (
        <Job key={job.id} job={job} />
      ))}
    </Section>
  );
}

function Job({ job }: { job: GivenUpJob }) {
  const { labId, timeZone } = useLab();
  const queries = useQueryClient();
  const toast = useToast();
  const retry = useLabMutation(retryJob, () => {
    toast.show({ text: 'It is tried again.' });
    void queries.invalidateQueries({ queryKey: labKey(labId, listGivenUpJobs) });
  });
  const name = kinds[job.kind] ?? job.kind;
  return (
    <Panel edge="danger" className="gap-2" testID="given-up-job">
      <Body strong>{name}</Body>
      <Body size={13} className="break-words">
        {job.lastError}
      </Body>
      <View className="flex-row flex-wrap items-center justify-between gap-2">
        <Label className="shrink">
          {job.attempts} tries; given up {formatDayAndClock(Date.parse(job.givenUpAt), timeZone)}
        </Label>
        <Button
          label="Try again"
          accessibilityLabel={`Try again: ${name}`}
          busy={retry.isPending}
          onPress={() => retry.mutate({ params: { jobId: job.id } })}
          testID="retry-job"
        />
      </View>
      {retry.isError ? <ProblemNotice title="It was not tried again" {...wordsOf(retry.error)} /> : null}
    </Panel>
  );
}
