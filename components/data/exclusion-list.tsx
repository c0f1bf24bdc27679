import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabQuery, useMay, wordsOf } from '@/components/api';
import { Body, Button, Icon, Label, Num, ProblemNotice } from '@/components/ui';
import { listExclusions, type ExclusionView } from '@/shared/contracts/exclusions';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { WithdrawSheet } from './exclude-sheet';
import { stretchWords } from './stretch';

const none: readonly ExclusionView[] = [];

/** Exclusions of a run, withdrawn ones too, and what to call when they changed. */
export function useExclusions(runId: string) {
  const query = useLabQuery(listExclusions, { params: { runId } });
  return {
    exclusions: query.data?.data.items ?? none,
    error: query.isError ? wordsOf(query.error).detail : null,
    onChanged: () => void query.refetch(),
  };
}

export type Exclusions = ReturnType<typeof useExclusions>;

/** Each exclusion with its stretch, its reason and who made it; those in force can be withdrawn. */
export function ExclusionList({ exclusions, error, onChanged }: Exclusions) {
  const [asked, setAsked] = useState<ExclusionView | null>(null);
  return (
    <View className="gap-3" testID="exclusions">
      {error === null ? null : (
        <ProblemNotice title="What is excluded could not be loaded" detail={error} action={{ label: 'Try again', onPress: onChanged }} />
      )}
      {exclusions.length === 0 ? null : (
        <View role="list" className="gap-3">
          {exclusions.map((one) => (
            <Exclusion key={one.id} exclusion={one} onWithdraw={() => setAsked(one)} />
          ))}
        </View>
      )}
      {asked === null ? null : <WithdrawSheet exclusion={asked} onClose={() => setAsked(null)} onDone={onChanged} />}
    </View>
  );
}

function Exclusion({ exclusion, onWithdraw }: { exclusion: ExclusionView; onWithdraw: () => void }) {
  const { timeZone } = useLab();
  const may = useMay('data.exclude');
  const { made, withdrawn } = exclusion;
  const at = (act: { at: string }) => formatDayAndClock(Date.parse(act.at), timeZone);
  const words = stretchWords(exclusion, timeZone);
  return (
    <View role="listitem" className="flex-row flex-wrap items-start gap-x-3 gap-y-1" testID="exclusion">
      <View className="pt-0.5">
        <Icon name={withdrawn === null ? 'failed' : 'note'} size={16} tone={withdrawn === null ? 'lamp' : 'dim'} />
      </View>
      <View className="min-w-0 flex-1 gap-0.5">
        <Body size={15}>
          {withdrawn === null ? 'Excluded' : 'Withdrawn'} <Num size={13}>{words}</Num>
        </Body>
        <Body size={15}>{made.reason}</Body>
        <Label>
          {at(made)} by {made.by}
        </Label>
        {withdrawn === null ? null : (
          <Label>
            Withdrawn {at(withdrawn)} by {withdrawn.by}: {withdrawn.reason}
          </Label>
        )}
      </View>
      {withdrawn === null && may.ok ? (
        <Button
          kind="quiet"
          label="Withdraw"
          accessibilityLabel={`Withdraw the exclusion of ${words}`}
          onPress={onWithdraw}
          testID="withdraw"
        />
      ) : null}
    </View>
  );
}
