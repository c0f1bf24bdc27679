import { callOnce, serverNowIso, useLab, useLabCall } from '@/components/api';
import { resumeRun } from '@/shared/contracts/going-on';
import { reviewResume } from '@/shared/contracts/reviews';
import { remainingFacts, ReviewedAct, type RunSheetProps } from './reviewed-act';

/** What a resume will do, with the plan from here on. */
export function ResumeSheet({ view, timeZone, serverNowMs, onClose }: RunSheetProps) {
  const { labId } = useLab();
  const askReview = useLabCall(reviewResume);
  return (
    <ReviewedAct
      title="Resume this run"
      intro="The source masses will move. Whoever armed the rig answers for it on site."
      of={view.id}
      ask={async () => (await askReview({ params: { runId: view.id } })).data}
      send={({ token }) =>
        callOnce(resumeRun, { params: { labId, runId: view.id }, body: { tappedAt: serverNowIso(), reviewToken: token } })
      }
      facts={(review) => [
        ['Rig', view.rigName],
        ['Protocol', `${view.protocolName}, revision ${view.protocolRevision}`],
        ...remainingFacts(review, { view, timeZone, serverNowMs }),
      ]}
      confirm={{ label: 'Resume', icon: 'start', testID: 'resume-confirm' }}
      failedTitle="Not resumed"
      onClose={onClose}
      testID="resume-sheet"
    />
  );
}
