import { useState } from 'react';
import { View } from 'react-native';
import { Unanswered, wordsOf } from '@/components/api';
import { useReview } from '@/components/rigs/use-review';
import { Body, Label, PressAndKeep, ProblemNotice, Row, Sheet, type IconName } from '@/components/ui';
import type { RunView } from '@/shared/contracts/runs';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatPercent } from '@/shared/lib/format-number';
import { formatClockWithZone } from '@/shared/lib/format-time';
import { stepTitle } from './run-words';

/** What every review of a run that is to go on says of the plan. */
export interface Remaining {
  token: string;
  dwellsLeft: number;
  finishAt: string;
  next: { path: string; kind: string; label: string; station: string } | null;
  firstMove: string;
  plannedU: { soFar: number | null; atEnd: number | null };
}

export interface RunSheetProps {
  view: RunView;
  timeZone: string;
  serverNowMs: number;
  onClose: () => void;
}

export type Fact = readonly [name: string, value: string];

const capital = (text: string) => text.charAt(0).toUpperCase() + text.slice(1);
const leftWords = (dwells: number) =>
  `${String(dwells)} ${dwells === 1 ? 'dwell' : 'dwells'}, ${String(Math.floor(dwells / 2))} ${dwells >= 2 && dwells < 4 ? 'pair' : 'pairs'}`;
const percent = (share: number | null) => (share === null ? '–' : formatPercent(share));

const measuredName = 'u of near − far, measured';

/** What the scatter of the good dwells says so far; the geometry has no part in it. */
function measuredWords(reversal: RunView['reversal']): string {
  if (reversal === null) return 'no good pair yet';
  const { relativeU, reversals } = reversal;
  const by = `by ${String(reversals)} ${reversals === 1 ? 'reversal' : 'reversals'}`;
  return relativeU === null ? `too few dwells to tell, ${by}` : `${percent(relativeU)} so far, ${by}`;
}

/** The plan from here on: first move, dwells and pairs left, the finish in the lab's time, u of G as planned. */
export function remainingFacts(review: Remaining | null, { view, timeZone, serverNowMs }: Omit<RunSheetProps, 'onClose'>): Fact[] {
  const measured = [measuredName, measuredWords(view.reversal)] as const;
  if (review === null)
    return [...['Goes on with', 'First move', 'Left', 'Ends about', 'u of G by the plan'].map((name) => [name, '…'] as const), measured];
  const finishMs = Date.parse(review.finishAt);
  const inS = Math.max(0, (finishMs - serverNowMs) / 1000);
  const { soFar, atEnd } = review.plannedU;
  const known = soFar !== null || atEnd !== null;
  return [
    ['Goes on with', review.next === null ? 'its end' : stepTitle({ ...review.next, outcome: null }, view.protocol)],
    ['First move', capital(review.firstMove)],
    ['Left', leftWords(review.dwellsLeft)],
    ['Ends about', `${formatClockWithZone(finishMs, { timeZone, weekday: true })}, in ${formatDuration(inS)}`],
    ['u of G by the plan', known ? `${percent(soFar)} now, ${percent(atEnd)} at the end` : 'the rig does not tell'],
    measured,
  ];
}

interface ReviewedActProps<T extends Remaining> {
  title: string;
  intro: string;
  /** Names what is reviewed; another name is another review. */
  of: string;
  ask: () => Promise<T>;
  /** Sends the act once, with the review that was confirmed. */
  send: (review: T) => Promise<unknown>;
  facts: (review: T | null) => readonly Fact[];
  confirm: { label: string; icon: IconName; testID: string };
  /** Over the sentence that says why it was not done. */
  failedTitle: string;
  onClose: () => void;
  testID: string;
}

/** An act that lets the masses move, reviewed before it is sent. Sent once; never again by itself. */
export function ReviewedAct<T extends Remaining>(props: ReviewedActProps<T>) {
  const { title, intro, of, ask, send, facts, confirm, failedTitle, onClose, testID } = props;
  const [busy, setBusy] = useState(false);
  const [problem, setProblem] = useState<unknown>(null);
  const { review, problem: unreviewed, renew } = useReview(of, ask, true);
  const act = async () => {
    if (review === null) return;
    setBusy(true);
    setProblem(null);
    try {
      await send(review);
      onClose();
    } catch (error) {
      renew();
      setProblem(error);
    } finally {
      setBusy(false);
    }
  };
  const shown = facts(review);
  const said = problem ?? (review === null ? unreviewed : null);
  return (
    <Sheet
      open
      title={title}
      onClose={onClose}
      testID={testID}
      footer={
        <PressAndKeep
          label={confirm.label}
          icon={confirm.icon}
          statement="Nobody is within reach of the turntable; it may move."
          onConfirm={() => void act()}
          disabled={review === null}
          busy={busy}
          testID={confirm.testID}
        />
      }
    >
      <Body>{intro}</Body>
      <View>
        {shown.map(([name, value], index) => (
          <Row key={name} last={index === shown.length - 1} className="justify-between">
            <Label>{name}</Label>
            <Body className="shrink text-right">{value}</Body>
          </Row>
        ))}
      </View>
      {said === null ? null : (
        <ProblemNotice title={said instanceof Unanswered ? 'No answer' : failedTitle} detail={wordsOf(said).detail} />
      )}
      <Label>This counts for 5 s after you let go. It is sent once and never repeated by itself.</Label>
    </Sheet>
  );
}
