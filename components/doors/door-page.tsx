import { useQuery } from '@tanstack/react-query';
import { useLocalSearchParams } from 'expo-router';
import { ScrollView, View } from 'react-native';
import { call, isProblem } from '@/components/api';
import { Body, Heading, Num } from '@/components/ui';
import { usePageTitle } from '@/components/ui/use-page-title';
import { doorCard, type DoorCard } from '@/shared/contracts/doors';
import { formatClock, formatClockWithZone } from '@/shared/lib/format-time';
import { doorWords } from './door-words';

const everyMs = 10_000;
/** What was read longer ago is not shown as true. */
const oldMs = 60_000;

/** A page for a tablet or an old phone at the door: red on black, large, without controls, without an account. */
export function DoorPage() {
  const { token = '' } = useLocalSearchParams<{ token: string }>();
  const query = useQuery({
    queryKey: ['door', token],
    queryFn: () => call(doorCard, { params: { token } }),
    refetchInterval: everyMs,
    retry: false,
  });
  const card = query.data?.data;
  usePageTitle(card === undefined ? 'Door card' : `${doorWords[card.state].headline}: ${card.rigName}`);
  const gone = query.error !== null && isProblem(query.error, 'not-found');
  const old = query.isError && query.errorUpdatedAt - query.dataUpdatedAt > oldMs;
  return (
    <ScrollView role="main" className="theme-red flex-1 bg-ink" contentContainerClassName="min-h-full justify-center gap-8 px-6 py-10">
      {gone ? (
        <Large title="This door card has ended" why="Ask the lab for the new one." />
      ) : card === undefined || old ? (
        <Large
          title="Do not enter"
          why={query.isPending ? 'Asking whether a measurement is on.' : 'The server cannot be reached: ask the lab before you enter.'}
        />
      ) : (
        <Card card={card} />
      )}
    </ScrollView>
  );
}

function Large({ title, why }: { title: string; why: string }) {
  return (
    <View role="status" className="gap-4">
      <Heading level={1} size={30} className="text-[44px] leading-[52px] wide:text-[84px] wide:leading-[96px]">
        {title}
      </Heading>
      <Body size={20}>{why}</Body>
    </View>
  );
}

function Card({ card }: { card: DoorCard }) {
  const { timeZone } = card;
  const { headline, why } = doorWords[card.state];
  return (
    <View className="gap-8" testID="door-card">
      <Body size={20} tone="dim">
        {card.rigName}, {card.labName}
      </Body>
      <Large title={headline} why={why} />
      {card.untilAt === null ? null : (
        <Line label="Until" value={formatClockWithZone(Date.parse(card.untilAt), { timeZone, weekday: true })} />
      )}
      {card.nextAt === null || card.state === 'run' ? null : (
        <Line label="Next measurement" value={formatClockWithZone(Date.parse(card.nextAt), { timeZone, weekday: true })} />
      )}
      <Line label="Ring" value={card.ring} />
      {card.onCall.length === 0 ? null : <Line label="On call" value={card.onCall.join(', then ')} />}
      <Body tone="dim">As of {formatClock(Date.parse(card.serverAt), { timeZone, precision: 'seconds' })}. This card moves nothing.</Body>
    </View>
  );
}

function Line({ label, value }: { label: string; value: string }) {
  return (
    <View className="gap-1">
      <Body tone="dim">{label}</Body>
      <Num size={24}>{value}</Num>
    </View>
  );
}
