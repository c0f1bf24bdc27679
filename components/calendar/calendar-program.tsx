import { View } from 'react-native';
import { useLab, useLabMutation, useLabQuery, wordsOf } from '@/components/api';
import { Body, Button, Label, Panel, ProblemNotice, Section } from '@/components/ui';
import { endFeed, makeFeed, readFeedState } from '@/shared/contracts/schedules';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { useRefreshCalendar } from './use-refresh-calendar';

/** A secret address at which one's own calendar program reads what is planned. */
export function CalendarProgram() {
  const { timeZone } = useLab();
  const refresh = useRefreshCalendar();
  const state = useLabQuery(readFeedState);
  const make = useLabMutation(makeFeed, refresh);
  const end = useLabMutation(endFeed, () => {
    make.reset();
    refresh();
  });
  const madeAt = state.data?.data.madeAt ?? null;
  const made = make.data?.data;
  const error = make.error ?? end.error;
  return (
    <Section title="Calendar program">
      <Panel className="gap-3">
        <Label>
          A secret address of your own (iCalendar) shows what is planned in any calendar program. Whoever has it can read it; it shows no
          results and moves nothing.
        </Label>
        {made === undefined ? null : (
          <View className="gap-1" role="status">
            <Body size={13} className="break-all font-mono" testID="feed-address">
              {made.address}
            </Body>
            <Label>Shown this once. Copy it into your calendar program.</Label>
          </View>
        )}
        {madeAt === null || made !== undefined ? null : (
          <Label>You have one, made {formatDayAndClock(Date.parse(madeAt), timeZone)}.</Label>
        )}
        <View className="flex-row flex-wrap gap-2">
          <Button
            icon="link"
            label={madeAt === null ? 'Make an address' : 'Make a new one'}
            busy={make.isPending}
            onPress={() => make.mutate({})}
            testID="make-feed"
          />
          {madeAt === null ? null : (
            <Button kind="quiet" label="End it" busy={end.isPending} onPress={() => end.mutate({})} testID="end-feed" />
          )}
        </View>
        {error === null ? null : <ProblemNotice title="Nothing was changed" {...wordsOf(error)} />}
      </Panel>
    </Section>
  );
}
