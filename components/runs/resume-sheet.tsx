import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabCall, wordsOf } from '@/components/api';
import { Body, Label, PressAndKeep, ProblemNotice, Row, Sheet } from '@/components/ui';
import { useReview } from '@/components/rigs/use-review';
import { reviewResume } from '@/shared/contracts/reviews';
import type { RunView } from '@/shared/contracts/runs';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatClockWithZone } from '@/shared/lib/format-time';
import { stepTitle } from './run-words';
import { ResumeExpired, resumeOnce } from './use-intervention';

interface ResumeSheetProps {
  view: RunView;
  timeZone: string;
  serverNowMs: number;
  onClose: () => void;
}

const leftWords = (dwells: number) => `${String(dwells)} dwells, ${String(Math.floor(dwells / 2))} pairs`;

const endWords = (finishMs: number, nowMs: number, timeZone: string) =>
  `${formatClockWithZone(finishMs, { timeZone, weekday: true })}, in ${formatDuration(Math.max(0, (finishMs - nowMs) / 1000))}`;

/** What a resume will do, reviewed before it moves anything. Sent once; never again by itself. */
export function ResumeSheet({ view, timeZone, serverNowMs, onClose }: ResumeSheetProps) {
  const { labId } = useLab();
  const [busy, setBusy] = useState(false);
  const [problem, setProblem] = useState<string | null>(null);
  const askReview = useLabCall(reviewResume);
  const { review, renew } = useReview(view.id, async () => (await askReview({ params: { runId: view.id } })).data, true);
  const resume = async () => {
    if (review === null) return;
    setBusy(true);
    setProblem(null);
    try {
      await resumeOnce({ labId, runId: view.id }, review.token);
      onClose();
    } catch (error) {
      renew();
      setProblem(error instanceof ResumeExpired ? error.message : wordsOf(error).detail);
    } finally {
      setBusy(false);
    }
  };
  const facts: [string, string][] = [
    ['Rig', view.rigName],
    ['Protocol', `${view.protocolName}, revision ${view.protocolRevision}`],
    ['Goes on with', view.current === null ? 'the next step' : stepTitle({ ...view.current, outcome: null }, view.protocol)],
    ['Left', review === null ? '…' : leftWords(review.dwellsLeft)],
    ['Ends about', review === null ? '…' : endWords(Date.parse(review.finishAt), serverNowMs, timeZone)],
  ];
  return (
    <Sheet
      open
      title="Resume this run"
      onClose={onClose}
      testID="resume-sheet"
      footer={
        <PressAndKeep
          label="Resume"
          icon="start"
          statement="Nobody is within reach of the turntable; it may move."
          onConfirm={() => void resume()}
          disabled={review === null}
          busy={busy}
          testID="resume-confirm"
        />
      }
    >
      <Body>The source masses will move. Whoever armed the rig answers for it on site.</Body>
      <View>
        {facts.map(([name, value], index) => (
          <Row key={name} last={index === facts.length - 1} className="justify-between">
            <Label>{name}</Label>
            <Body className="shrink text-right">{value}</Body>
          </Row>
        ))}
      </View>
      {problem === null ? null : <ProblemNotice title="Not resumed" detail={problem} />}
      <Label>A resume counts for 5 s after you let go. It is sent once and never repeated by itself.</Label>
    </Sheet>
  );
}
