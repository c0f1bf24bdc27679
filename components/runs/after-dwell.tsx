import { useState } from 'react';
import { View } from 'react-native';
import { callOnce, serverNowIso, useConnection, useLab, useMay, Unanswered, wordsOf } from '@/components/api';
import { Body, Button, Panel, ProblemNotice } from '@/components/ui';
import { withdrawHold } from '@/shared/contracts/going-on';
import type { RunView } from '@/shared/contracts/runs';
import { SkipStep } from './skip-sheet';

interface AfterDwellProps {
  view: RunView;
  timeZone: string;
  serverNowMs: number;
  onTap: () => void;
}

/** The gentle way to hold, at the end of the dwell, so that its data count in full; how to take that back; and how to leave the rest of it out. */
export function AfterDwell({ view, timeZone, serverNowMs, onTap }: AfterDwellProps) {
  if (view.state !== 'running' || view.current === null) return null;
  if (view.holdAfterDwell) return <Pending view={view} />;
  const what = view.current.kind === 'dwell' ? 'dwell' : 'step';
  return (
    <View className="flex-row flex-wrap gap-3">
      <Button label={`Hold after this ${what}`} icon="dwell" onPress={onTap} testID="hold-after-dwell" className="grow" />
      <SkipStep view={view} timeZone={timeZone} serverNowMs={serverNowMs} />
    </View>
  );
}

/** It can be withdrawn as long as it waits; that lets motion happen, so it is sent once. */
function Pending({ view }: { view: RunView }) {
  const { labId } = useLab();
  const may = useMay('run.resume');
  const { online } = useConnection();
  const [busy, setBusy] = useState(false);
  const [problem, setProblem] = useState<unknown>(null);
  const withdraw = async () => {
    setBusy(true);
    setProblem(null);
    try {
      await callOnce(withdrawHold, { params: { labId, runId: view.id }, body: { tappedAt: serverNowIso() } });
    } catch (error) {
      setProblem(error);
    } finally {
      setBusy(false);
    }
  };
  return (
    <Panel edge="lamp" className="gap-3" testID="hold-pending">
      <Body>Will hold when this {view.current?.kind === 'dwell' ? 'dwell' : 'step'} has ended. Nothing is cut short.</Body>
      {may.ok ? (
        <Button
          label="Withdraw this hold"
          icon="undo"
          onPress={() => void withdraw()}
          busy={busy}
          disabled={!online}
          className="self-start"
          testID="withdraw-hold"
        />
      ) : null}
      {problem === null ? null : (
        <ProblemNotice title={problem instanceof Unanswered ? 'No answer' : 'Not withdrawn'} detail={wordsOf(problem).detail} />
      )}
    </Panel>
  );
}
