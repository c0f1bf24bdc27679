import { useState } from 'react';
import { useLabQuery, wordsOf } from '@/components/api';
import { Button, Loading, Panel, ProblemNotice, Section } from '@/components/ui';
import { startChecks, type RigView } from '@/shared/contracts/rigs';
import { ArmSheet } from './arm-sheet';
import { ArmingProgress, VirtualInputsPanel } from './arming-progress';
import { CautionsPanel, useOwnSignature } from './cautions-panel';
import { CheckList } from './check-list';
import type { StartChoice } from './start-review';

/** The start checks of a choice, made again every 3 s while they are seen. */
export const useStartChecks = (rig: RigView, { protocolId, revision }: StartChoice) =>
  useLabQuery(startChecks, { params: { rigId: rig.id }, query: { protocolId, revision }, everyMs: 3000, enabled: protocolId !== '' });

/** What stands between the rig and a start; arming is offered where it is the arm that is missing. */
export function StartCheckSection({ rig, choice }: { rig: RigView; choice: StartChoice }) {
  const checks = useStartChecks(rig, choice);
  const [arming, setArming] = useState(false);
  const signed = useOwnSignature(rig) !== null;
  const data = checks.data?.data;
  const close = () => {
    setArming(false);
    void checks.refetch();
  };
  return (
    <Section title="Start checks">
      {data !== undefined ? (
        <CheckList checks={data.checks} />
      ) : checks.isError ? (
        <ProblemNotice
          title="The start checks could not be made"
          {...wordsOf(checks.error)}
          action={{ label: 'Try again', onPress: () => void checks.refetch() }}
        />
      ) : (
        <Loading label="Making the start checks" />
      )}
      {rig.arming === null ? null : (
        <>
          <Panel edge="lamp">
            <ArmingProgress rig={rig} arming={rig.arming} />
          </Panel>
          <VirtualInputsPanel rig={rig} />
        </>
      )}
      {signed || arming ? null : <CautionsPanel rig={rig} />}
      {rig.arm === null && rig.arming === null ? (
        <Button icon="key" label="Arm the rig" className="self-start" onPress={() => setArming(true)} testID="arm-here" />
      ) : null}
      {arming ? <ArmSheet rig={rig} onClose={close} /> : null}
    </Section>
  );
}
