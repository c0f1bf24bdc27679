import { useState } from 'react';
import { View } from 'react-native';
import { useConnection, useMay } from '@/components/api';
import { Body, Button, Label, Panel } from '@/components/ui';
import type { RunView } from '@/shared/contracts/runs';
import { ResumeSheet } from './resume-sheet';
import { SkipStep } from './skip-sheet';

interface HeldNoticeProps {
  view: RunView;
  timeZone: string;
  serverNowMs: number;
}

/** Why the run is held and what lets it go on; the way to resume, or the reason why not. */
export function HeldNotice(props: HeldNoticeProps) {
  const { view } = props;
  // A part of its own: a review left open by one hold must not open by itself at the next.
  if (view.state === 'held') return <HeldPanel {...props} />;
  return view.reason === '' ? null : <ReasonPanel reason={view.reason} />;
}

function HeldPanel({ view, timeZone, serverNowMs }: HeldNoticeProps) {
  const [reviewing, setReviewing] = useState(false);
  const may = useMay('run.resume');
  const { online } = useConnection();
  const why = !may.ok
    ? may.why
    : !online
      ? 'The server cannot be reached; a resume is never kept for later.'
      : view.mayResume.ok
        ? ''
        : view.mayResume.why;
  return (
    <Panel edge="lamp" className="gap-3" testID="held-notice">
      <Body>{view.reason === '' ? 'The run is held. Nothing moves.' : view.reason}</Body>
      <View className="flex-row flex-wrap items-center gap-3">
        <Button kind="primary" icon="start" label="Resume" disabled={why !== ''} onPress={() => setReviewing(true)} testID="resume" />
        <SkipStep view={view} timeZone={timeZone} serverNowMs={serverNowMs} />
        {why === '' ? null : (
          <Label tone="text" className="min-w-0 shrink basis-[200px] grow" testID="resume-why">
            {why}
          </Label>
        )}
      </View>
      {reviewing ? <ResumeSheet view={view} timeZone={timeZone} serverNowMs={serverNowMs} onClose={() => setReviewing(false)} /> : null}
    </Panel>
  );
}

function ReasonPanel({ reason }: { reason: string }) {
  return (
    <Panel edge="lamp">
      <Body>{reason}</Body>
    </Panel>
  );
}
