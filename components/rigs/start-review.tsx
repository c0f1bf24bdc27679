import { useRouter, type Href } from 'expo-router';
import { View } from 'react-native';
import { serverNowIso, useLab, useLabCall, useLabOnce, useLabQuery, useSession, Unanswered, wordsOf } from '@/components/api';
import { Body, Label, Num, Panel, PressAndKeep, ProblemNotice, Section } from '@/components/ui';
import { getOnCall } from '@/shared/contracts/calls';
import { reviewStart } from '@/shared/contracts/reviews';
import type { RigView } from '@/shared/contracts/rigs';
import { startRun } from '@/shared/contracts/runs';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatClock, zoneName } from '@/shared/lib/format-time';
import { useStartChecks } from './start-check-section';
import { useReview } from './use-review';
import { useRefreshRigs } from './use-rig';

export interface StartChoice {
  protocolId: string;
  protocolName: string;
  revision: number;
  massSetId: string;
  notes: string;
}

/** The review and the act that makes masses move. Nothing here is ever sent twice or by itself. */
export function StartReview({ rig, choice }: { rig: RigView; choice: StartChoice }) {
  const checks = useStartChecks(rig, choice);
  const data = checks.data?.data;
  if (data === undefined) return null;
  return (
    <Section title="Review">
      <Review rig={rig} choice={choice} durationS={data.durationS} finishAt={data.finishAt} firstMove={data.firstMove} />
      <StartAct rig={rig} choice={choice} mayStart={data.mayStart} stale={checks.isError} />
    </Section>
  );
}

/** Whom an alarm of this run rings, in their order. */
function onCallWords(order: readonly { userId: string; name: string }[], ownId: string): string {
  if (order.length === 0) return 'nobody: set the order on the page of the lab';
  return order.map(({ userId, name }) => (userId === ownId ? `${name} (you)` : name)).join(', then ');
}

interface ReviewProps {
  rig: RigView;
  choice: StartChoice;
  durationS: number;
  finishAt: string;
  firstMove: string;
}

function Review({ rig, choice, durationS, finishAt, firstMove }: ReviewProps) {
  const { timeZone } = useLab();
  const { state } = useSession();
  const onCall = useLabQuery(getOnCall);
  const facts: readonly (readonly [string, string])[] = [
    ['Rig', `${rig.name}, revision ${rig.revision}`],
    ['Protocol', `${choice.protocolName}, revision ${choice.revision}`],
    ['Mass set', rig.massSets.find(({ id }) => id === choice.massSetId)?.label ?? '–'],
    ['First move', firstMove],
    ['On site', rig.arm === null ? 'nobody: the rig is not armed' : `${rig.arm.name}${rig.arm.note === '' ? '' : `: “${rig.arm.note}”`}`],
    ['On call', onCallWords(onCall.data?.data.order ?? [], state.kind === 'signed-in' ? state.me.user.id : '')],
  ];
  return (
    <Panel className="gap-4">
      <View className="flex-row flex-wrap items-end gap-x-8 gap-y-3">
        <View>
          <Label>Finish</Label>
          <Num size={44} light testID="start-finish">
            {formatClock(Date.parse(finishAt), { timeZone })}
          </Num>
          <Label>
            {formatClock(Date.parse(finishAt), { timeZone, weekday: true }).split(' ')[1]}, {zoneName(timeZone)}
          </Label>
        </View>
        <View>
          <Label>Length</Label>
          <Num size={24} light>
            {formatDuration(durationS)}
          </Num>
        </View>
      </View>
      <View className="border-t border-line pt-2">
        {facts.map(([label, words]) => (
          <View key={label} className="flex-row gap-3 py-1.5">
            <Label className="w-[84px] pt-0.5">{label}</Label>
            <Body className="flex-1">{words}</Body>
          </View>
        ))}
      </View>
    </Panel>
  );
}

interface StartActProps {
  rig: RigView;
  choice: StartChoice;
  mayStart: boolean;
  stale: boolean;
}

function StartAct({ rig, choice, mayStart, stale }: StartActProps) {
  const router = useRouter();
  const refresh = useRefreshRigs();
  const start = useLabOnce(startRun, ({ data }) => {
    refresh();
    router.replace(`/runs/${data.id}` as Href);
  });
  const { protocolId, revision, massSetId, notes } = choice;
  const askReview = useLabCall(reviewStart);
  const allowed = mayStart && massSetId !== '' && !stale;
  const chosen = { protocolId, revision, massSetId };
  const { review, renew } = useReview(
    JSON.stringify([rig.id, rig.revision, chosen]),
    async () => (await askReview({ params: { rigId: rig.id }, body: chosen })).data,
    allowed,
  );
  const send = () => {
    if (review === null) return;
    const body = { rigId: rig.id, ...chosen, notes, tappedAt: serverNowIso(), reviewToken: review.token };
    // A token counts once, whatever becomes of the start.
    start.mutate({ body }, { onError: renew });
  };
  const ready = allowed && review !== null;
  return (
    <View className="gap-3">
      {start.isError ? (
        <ProblemNotice title={start.error instanceof Unanswered ? 'No answer' : 'The run was not started'} {...wordsOf(start.error)} />
      ) : null}
      {allowed ? null : (
        <Body tone="dim">
          {stale
            ? 'The checks are old: the server does not answer. Nothing can be started until it does.'
            : 'A check stands against this start. The run may be started when every check passes.'}
        </Body>
      )}
      <PressAndKeep
        label="Start the run"
        icon="start"
        statement="I have read the review; the rig may move."
        onConfirm={send}
        disabled={!ready}
        busy={start.isPending}
        testID="start-run"
      />
      <Label>Stop in this application is no emergency stop: the hard-wired one is at the rig.</Label>
    </View>
  );
}
