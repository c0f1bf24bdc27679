import { useState } from 'react';
import { View } from 'react-native';
import { callOnce, serverNowIso, useConnection, useLab, useMay, Unanswered, wordsOf } from '@/components/api';
import { Body, Button, Panel, ProblemNotice } from '@/components/ui';
import { withdrawFinish } from '@/shared/contracts/going-on';
import { finishEarly, type RunView } from '@/shared/contracts/runs';
import { formatClock } from '@/shared/lib/format-time';
import type { Step } from '@/shared/protocol/document';

interface FinishEarlyProps {
  view: RunView;
  timeZone: string;
}

const goesRound = ({ kind }: Step): boolean => kind === 'repeat';

/** To end a run on a whole pair, before the end of its protocol; what is asked for already, by somebody, by the night window or for few good dwells; and how to take it back. */
export function FinishEarly({ view, timeZone }: FinishEarlyProps) {
  const { labId } = useLab();
  const may = useMay('run.hold');
  const mayGoOn = useMay('run.resume');
  const { online } = useConnection();
  const [busy, setBusy] = useState(false);
  const [problem, setProblem] = useState<{ title: string; error: unknown } | null>(null);
  const send = (title: string, act: () => Promise<unknown>) => async () => {
    setBusy(true);
    setProblem(null);
    try {
      await act();
    } catch (error) {
      setProblem({ title, error });
    } finally {
      setBusy(false);
    }
  };
  if (!['running', 'holding', 'held'].includes(view.state) || !view.protocol.steps.some(goesRound)) return null;
  const params = { labId, runId: view.id };
  const asked = view.finishing?.withdrawnBy === null ? view.finishing : null;
  const end = send('Not asked for', () => callOnce(finishEarly, { params, body: {} }));
  const goOn = send('Not taken back', () => callOnce(withdrawFinish, { params, body: { tappedAt: serverNowIso() } }));
  const failed =
    problem === null ? null : (
      <ProblemNotice title={problem.error instanceof Unanswered ? 'No answer' : problem.title} detail={wordsOf(problem.error).detail} />
    );
  if (asked === null)
    return may.ok ? (
      <View className="gap-3">
        <Button
          kind="quiet"
          icon="tick"
          label="End after this pair"
          onPress={() => void end()}
          busy={busy}
          disabled={!online}
          className="self-start"
          testID="finish-early"
        />
        {failed}
      </View>
    ) : null;
  return (
    <Panel edge="lamp" className="gap-3" testID="finish-pending">
      <Body>{askedWords(view, asked, timeZone)}</Body>
      {mayGoOn.ok ? (
        <Button
          label="Go on to the end of the protocol"
          icon="undo"
          onPress={() => void goOn()}
          busy={busy}
          disabled={!online}
          className="self-start"
          testID="withdraw-finish"
        />
      ) : null}
      {failed}
    </Panel>
  );
}

/** Why and when the run ends early, in one or two sentences. */
export function askedWords(
  { predictedEndAt }: Pick<RunView, 'predictedEndAt'>,
  { by, overBy }: Pick<NonNullable<RunView['finishing']>, 'by' | 'overBy'>,
  timeZone: string,
): string {
  const clock = (iso: string) => formatClock(Date.parse(iso), { timeZone });
  const end = predictedEndAt === null ? '' : ` It is over at about ${clock(predictedEndAt)}.`;
  if (overBy === null && by === '')
    return `Few of the dwells are good, so the run ends with the pair under way.${end} Is what was wrong over? Then let it go on.`;
  if (overBy === null) return `The run ends with the pair under way, as ${by} asked: no other pair begins.${end}`;
  return `The run ends on a whole pair before the night window does, at ${clock(overBy)}.${end}`;
}
