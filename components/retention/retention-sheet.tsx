import { useQueryClient } from '@tanstack/react-query';
import { useEffect, useState } from 'react';
import { labKey, useLab, useLabMutation, useLabQuery, wordsOf } from '@/components/api';
import { useCalm } from '@/components/runs/use-now';
import { Body, Button, Field, Label, ProblemNotice, Sheet, Tabs, useToast } from '@/components/ui';
import { decideRetention, fewestDays, getRetention, mostDays, tryRetention, type RetentionRuleView } from '@/shared/contracts/retention';
import { dryWords } from './retention-words';

/** The lab (null) or a channel of it, with the rule that it has now. */
export interface KeptPlace {
  channelId: string | null;
  name: string;
  rule: RetentionRuleView | null;
}

type Way = 'for-ever' | 'as-lab' | 'days';

function wayOf({ channelId, rule }: KeptPlace): Way {
  if (rule === null) return channelId === null ? 'for-ever' : 'as-lab';
  if (rule.asLab) return 'as-lab';
  return rule.keepDays === null ? 'for-ever' : 'days';
}

const forEver = { value: 'for-ever', label: 'For ever' } as const;
const someDays = { value: 'days', label: 'Some days' } as const;
const asLab = { value: 'as-lab', label: 'As the lab' } as const;

const daysOf = (text: string): number | null => {
  const days = Number(text.trim());
  return Number.isInteger(days) && days >= fewestDays && days <= mostDays ? days : null;
};

/** Decides how long samples are kept; what a number of days would take away is said before it can be decided. */
export function RetentionSheet({ place, onClose }: { place: KeptPlace; onClose: () => void }) {
  const { labId } = useLab();
  const queries = useQueryClient();
  const toast = useToast();
  const [way, setWay] = useState<Way>(() => wayOf(place));
  const [text, setText] = useState(String(place.rule?.keepDays ?? 400));
  const days = daysOf(text);
  const calm = useCalm(days === null ? '' : String(days), 400);
  const [seen, setSeen] = useState<{ days: number; samples: number } | null>(null);
  const decide = useLabMutation(decideRetention, () => {
    void queries.invalidateQueries({ queryKey: labKey(labId, getRetention) });
    toast.show({ text: 'It is decided.' });
    onClose();
  });
  const ready = way !== 'days' || (days !== null && seen?.days === days);
  const goes = way === 'days' && (seen?.samples ?? 0) > 0;
  const send = () => decide.mutate({ body: { channelId: place.channelId, keep: way === 'days' ? (days ?? fewestDays) : way } });
  return (
    <Sheet
      open
      title={`How long samples of ${place.name} are kept`}
      onClose={onClose}
      testID="retention-sheet"
      footer={
        <Button
          kind={goes ? 'danger' : 'primary'}
          size="action"
          label={goes ? 'Thin them, a day from now' : 'Decide'}
          disabled={!ready}
          busy={decide.isPending}
          onPress={send}
          testID="decide-retention"
        />
      }
    >
      <Tabs
        label="How long"
        value={way}
        options={place.channelId === null ? [forEver, someDays] : [forEver, someDays, asLab]}
        onChange={setWay}
        testID="retention-way"
      />
      {way === 'days' ? (
        <>
          <Field
            label="Kept at their full rate for"
            value={text}
            onChange={setText}
            type="number"
            unit="days"
            error={days === null ? `whole days, ${String(fewestDays)} to ${String(mostDays)}` : undefined}
            testID="retention-days"
          />
          {calm === '' || days === null ? null : <DryRun channelId={place.channelId} keepDays={Number(calm)} onSeen={setSeen} />}
          <Label>
            Nothing goes for a day: until then another rule takes it back. What is gone cannot be brought back but from a backup. It saves
            room for channels of more than one sample a second.
          </Label>
        </>
      ) : null}
      {way === 'as-lab' ? <Label>Where the rule of the lab takes samples away, nothing of this channel goes for a day.</Label> : null}
      {decide.isError ? <ProblemNotice title="Nothing was decided" {...wordsOf(decide.error)} /> : null}
    </Sheet>
  );
}

interface DryRunProps {
  channelId: string | null;
  keepDays: number;
  onSeen: (seen: { days: number; samples: number }) => void;
}

/** What would go, counted now. */
function DryRun({ channelId, keepDays, onSeen }: DryRunProps) {
  const { timeZone } = useLab();
  const query = useLabQuery(tryRetention, { query: channelId === null ? { keepDays } : { channelId, keepDays } });
  const found = query.data?.data;
  const samples = found?.samples ?? null;
  useEffect(() => {
    if (samples !== null) onSeen({ days: keepDays, samples });
  }, [keepDays, samples, onSeen]);
  if (query.isError) return <ProblemNotice title="What would go could not be counted" {...wordsOf(query.error)} />;
  return (
    <Body strong role="status" testID="dry-run">
      {found === undefined ? 'Counting what would go …' : dryWords(found, timeZone)}
    </Body>
  );
}
