import { useState } from 'react';
import { callOnce, serverNowIso, useConnection, useLab, useLabCall, useMay } from '@/components/api';
import { Button } from '@/components/ui';
import { skipStep } from '@/shared/contracts/going-on';
import { reviewSkip } from '@/shared/contracts/reviews';
import { formatDuration } from '@/shared/lib/format-duration';
import { remainingFacts, ReviewedAct, type RunSheetProps } from './reviewed-act';
import { stepTitle } from './run-words';

/** What a skip leaves out and breaks, with the plan after it. */
function SkipSheet({ view, timeZone, serverNowMs, onClose, seq }: RunSheetProps & { seq: number }) {
  const { labId } = useLab();
  const askReview = useLabCall(reviewSkip);
  return (
    <ReviewedAct
      title="Skip this step"
      intro="The rest of the step is left out, and the run goes on with the next one: the source masses will move. It is written to the log."
      of={`${view.id} ${String(seq)}`}
      ask={async () => (await askReview({ params: { runId: view.id }, body: { seq } })).data}
      send={({ token }) =>
        callOnce(skipStep, { params: { labId, runId: view.id }, body: { tappedAt: serverNowIso(), reviewToken: token, seq } })
      }
      facts={(review) => [
        [
          'Leaves out',
          review === null ? '…' : `${stepTitle({ ...review, outcome: null }, view.protocol)}: ${formatDuration(review.leftS)} of it`,
        ],
        ['Counts no more', review === null ? '…' : brokenWords(review)],
        ...remainingFacts(review, { view, timeZone, serverNowMs }),
      ]}
      confirm={{ label: 'Skip', icon: 'forward', testID: 'skip-confirm' }}
      failedTitle="Not skipped"
      onClose={onClose}
      testID="skip-sheet"
    />
  );
}

function brokenWords({ kind, notGoodPath }: { kind: string; notGoodPath: string | null }): string {
  if (kind !== 'dwell') return 'Nothing: no dwell is cut';
  return notGoodPath === null ? 'This dwell, and the other of its pair when it comes' : `This dwell, and ${notGoodPath} of its pair`;
}

/** Offered while a step stands that may be left out, to those who may. */
export function SkipStep({ view, timeZone, serverNowMs }: Omit<RunSheetProps, 'onClose'>) {
  const [reviewed, setReviewed] = useState<number | null>(null);
  const may = useMay('run.resume');
  const { online } = useConnection();
  // A sheet that is open stays: its own sentence says what has changed.
  if (reviewed === null && (!may.ok || !view.maySkip.ok)) return null;
  return (
    <>
      <Button
        kind="quiet"
        icon="forward"
        label="Skip this step"
        disabled={!online}
        onPress={() => setReviewed(view.maySkip.seq)}
        testID="skip"
        className="grow"
      />
      {reviewed === null ? null : <SkipSheet {...{ view, timeZone, serverNowMs }} seq={reviewed} onClose={() => setReviewed(null)} />}
    </>
  );
}
