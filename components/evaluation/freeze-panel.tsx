import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabMutation, useMay, wordsOf } from '@/components/api';
import { Body, Button, Label, Panel, ProblemNotice, ReasonSheet, Section } from '@/components/ui';
import { freezeEvaluation, recomputeEvaluation, type ListedEvaluation } from '@/shared/contracts/evaluations';
import { formatDayAndClock } from '@/shared/lib/format-time';
import type { RigDocument } from '@/shared/rig/document';
import { softwareWords } from './evaluation-words';
import { RecomputationPanel } from './recomputation-panel';
import { atWork } from './use-evaluations';

interface FreezePanelProps {
  evaluation: ListedEvaluation;
  /** The newest recomputation of it. */
  recomputation: ListedEvaluation | null;
  /** As it was evaluated. */
  rig: RigDocument;
  onChanged: () => void;
}

/** Freezes an evaluation for good; of a frozen one it tells who did it and why, and whether computing it again gives the same. */
export function FreezePanel(props: FreezePanelProps) {
  const { evaluation, onChanged } = props;
  const may = useMay('evaluate');
  const [asks, setAsks] = useState(false);
  if (evaluation.frozen !== null) return <Frozen {...props} frozen={evaluation.frozen} />;
  return (
    <View className="flex-row flex-wrap items-center gap-3">
      <Button label="Freeze this evaluation" disabled={!may.ok} onPress={() => setAsks(true)} testID="freeze" />
      {may.ok ? null : (
        <Label className="shrink" tone="text">
          {may.why}
        </Label>
      )}
      {asks ? <FreezeSheet evaluationId={evaluation.id} onClose={() => setAsks(false)} onDone={onChanged} /> : null}
    </View>
  );
}

type FrozenProps = FreezePanelProps & { frozen: NonNullable<ListedEvaluation['frozen']> };

function Frozen({ evaluation, frozen, recomputation, rig, onChanged }: FrozenProps) {
  const may = useMay('evaluate');
  const { timeZone } = useLab();
  const recompute = useLabMutation(recomputeEvaluation, onChanged);
  const works = recompute.isPending || atWork(recomputation?.state);
  return (
    <Section title="Frozen">
      <Panel edge="near" className="gap-3" testID="frozen">
        <Body>{frozen.reason}</Body>
        <Label>
          Frozen {formatDayAndClock(Date.parse(frozen.at), timeZone)} by {frozen.by}. {softwareWords(evaluation.software)}.
        </Label>
        {recompute.isError ? <ProblemNotice title="It is not computed again" {...wordsOf(recompute.error)} /> : null}
        {recomputation === null ? null : <RecomputationPanel frozen={evaluation} recomputation={recomputation} rig={rig} />}
        <View className="flex-row flex-wrap items-center gap-3">
          <Button
            label="Recompute and compare"
            busy={works}
            disabled={!may.ok}
            onPress={() => recompute.mutate({ params: { evaluationId: evaluation.id } })}
            testID="recompute"
          />
          {may.ok ? null : (
            <Label className="shrink" tone="text">
              {may.why}
            </Label>
          )}
        </View>
      </Panel>
    </Section>
  );
}

/** Asks for the reason; freezing is what its one button does. */
function FreezeSheet({ evaluationId, onClose, onDone }: { evaluationId: string; onClose: () => void; onDone: () => void }) {
  const freeze = useLabMutation(freezeEvaluation, () => {
    onDone();
    onClose();
  });
  return (
    <ReasonSheet
      title="Freeze this evaluation"
      act="Freeze for good"
      keptIn="here and in the audit trail"
      sending={freeze}
      failed="It was not frozen"
      onSend={(reason) => freeze.mutate({ params: { evaluationId }, body: { reason } })}
      onClose={onClose}
      testID="freeze"
    >
      <Body tone="dim">It stays as it is, and nobody can undo that. The run can be evaluated again, beside it.</Body>
    </ReasonSheet>
  );
}
