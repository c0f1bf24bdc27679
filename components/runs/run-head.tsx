import { View } from 'react-native';
import type { RunView } from '@/shared/contracts/runs';
import { Body, Icon, Label, Num } from '@/components/ui';
import { formatCountdownWide } from '@/shared/lib/format-duration';
import { formatClock, zoneName } from '@/shared/lib/format-time';
import { runTitle } from './run-words';
import { useCalm } from './use-now';

interface RunHeadProps {
  view: RunView;
  timeZone: string;
  /** The server's present time, ms. */
  serverNowMs: number;
  /** What is shown is older than 5 s. */
  lost: boolean;
}

/** What the run is doing and, largest on the screen, how long that still takes. */
export function RunHead({ view, timeZone, serverNowMs, lost }: RunHeadProps) {
  const { words, mark } = runTitle(view);
  const title = lost ? `Last known: ${words}` : words;
  const spoken = useCalm(`${title}. ${dwellWords(view)}`);
  return (
    <View className="gap-1">
      <View className="sr-only" role="status" aria-live="polite" testID="run-status">
        <Body>{spoken}</Body>
      </View>
      <View className="flex-row items-center gap-3">
        <Icon name={mark.icon} size={20} tone={lost ? 'dim' : mark.tone === 'on-lamp' ? 'onLamp' : mark.tone} />
        <Body size={20} strong tone={lost ? 'dim' : 'text'} className="min-w-0 shrink grow" testID="run-state">
          {title}
        </Body>
        <Num size={15} tone="dim" className="flex-none" aria-label={dwellWords(view)}>
          {view.dwellsPlanned === 0 ? '' : `${dwellNumber(view)} of ${view.dwellsPlanned}`}
        </Num>
      </View>
      <TimeLeft {...{ view, timeZone, serverNowMs, lost }} />
    </View>
  );
}

/** The dwell that is going on counts from its beginning. */
function dwellNumber(view: RunView): number {
  return Math.min(view.dwellsPlanned, view.dwellsDone + (view.current?.kind === 'dwell' && view.current.outcome === null ? 1 : 0));
}

const dwellWords = (view: RunView): string => (view.dwellsPlanned === 0 ? '' : `Dwell ${dwellNumber(view)} of ${view.dwellsPlanned}`);

function TimeLeft({ view, timeZone, serverNowMs, lost }: RunHeadProps) {
  const counting = view.state === 'running' || view.state === 'rehearsing' || view.state === 'starting';
  const deadlineMs = counting && view.deadlineAt !== null ? Date.parse(view.deadlineAt) : null;
  const sinceMs = heldSince(view) ?? view.current?.startUtcMs ?? null;
  const seconds =
    deadlineMs !== null ? (deadlineMs - serverNowMs) / 1000 : sinceMs === null ? null : Math.max(0, (serverNowMs - sinceMs) / 1000);
  const kind = view.current?.kind === 'dwell' || view.current?.kind === 'swing' ? view.current.kind : 'step';
  const what =
    deadlineMs !== null
      ? view.waiting === null
        ? `left in this ${kind}`
        : 'until it gives up'
      : !counting && sinceMs !== null
        ? 'since it came to rest'
        : 'since this step began';
  const clock = (utcMs: number) => formatClock(utcMs, { timeZone });
  return (
    <View className="flex-row flex-wrap items-center gap-x-4">
      <Num light size={60} tone={lost ? 'dim' : 'text'} testID="time-left" role="timer">
        {seconds === null ? '–:––' : formatCountdownWide(seconds)}
      </Num>
      <View className="min-w-[150px] shrink">
        <Label>{what}</Label>
        <Label>
          {deadlineMs === null ? null : (
            <>
              {view.waiting === null ? 'ends' : 'at'} <Num size={13}>{clock(deadlineMs)}</Num>
            </>
          )}
          {deadlineMs === null || view.predictedEndAt === null ? '' : ' · '}
          {view.predictedEndAt === null ? null : (
            <>
              run <Num size={13}>{clock(Date.parse(view.predictedEndAt))}</Num>
            </>
          )}
        </Label>
        <Label>
          {weekday(view.predictedEndAt === null ? serverNowMs : Date.parse(view.predictedEndAt), timeZone)}, {zoneName(timeZone)}
        </Label>
      </View>
    </View>
  );
}

const weekday = (utcMs: number, timeZone: string) => formatClock(utcMs, { timeZone, weekday: true }).split(' ')[1] ?? '';

function heldSince(view: RunView): number | null {
  if (view.state !== 'held') return null;
  if (view.intervention?.confirmedAt) return Date.parse(view.intervention.confirmedAt);
  return view.current?.endUtcMs ?? null;
}
