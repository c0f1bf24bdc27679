import { useState } from 'react';
import { View } from 'react-native';
import { MayNote } from '@/components/people/may-note';
import { useMay } from '@/components/api';
import { ArmPanel } from '@/components/rigs/arm-panel';
import { CautionsPanel, useOwnSignature } from '@/components/rigs/cautions-panel';
import { Body, Button, Check, Icon, Panel, ProblemNotice, Section } from '@/components/ui';
import type { LineMessage } from '@/shared/contracts/link';
import type { RigView } from '@/shared/contracts/rigs';
import type { GuidedMove } from './use-guided';

interface Condition {
  words: string;
  met: boolean;
}

/** What must hold before anything moves. */
export function conditionsOf(line: LineMessage | null): Condition[] {
  const controller = line?.controller ?? null;
  return [
    { words: 'The controller answers', met: line?.health.condition === 'ready' && controller !== null },
    { words: 'No run has the rig', met: line !== null && line.takenBy === null },
    { words: 'Nobody else’s hands are in the rig', met: line !== null && line.locks.length === 0 },
    { words: 'A named person at the rig has armed it', met: line !== null && line.arm !== null },
    { words: 'The arm key on the controller is on', met: controller?.armKey === true },
    { words: 'The interlock is closed', met: controller?.interlockClosed === true },
    { words: 'The motor supply is present', met: controller?.supplyPresent === true },
    { words: 'The table stands still', met: controller !== null && !controller.moving },
  ];
}

/** Cautions first, then what must hold, then the beginning. */
export function BeforePanel({ rig, line, guided }: { rig: RigView; line: LineMessage | null; guided: GuidedMove }) {
  const [read, setRead] = useState(false);
  const mayMove = useMay('run.start').ok;
  const signed = useOwnSignature(rig) !== null;
  const conditions = [{ words: 'You have signed the cautions for this rig', met: signed }, ...conditionsOf(line)];
  const ready = conditions.every(({ met }) => met);
  return (
    <>
      <Section title="Before anything moves">
        <CautionsPanel rig={rig} />
      </Section>
      <ArmPanel rig={rig} />
      <Section title="What must hold">
        <Panel className="gap-2" testID="conditions">
          {conditions.map(({ words, met }) => (
            <View key={words} className="flex-row items-center gap-2">
              <Icon name={met ? 'passed' : 'warning'} size={16} tone={met ? 'good' : 'danger'} />
              <Body className="shrink">
                {words}
                {met ? '' : ': not yet'}
              </Body>
            </View>
          ))}
        </Panel>
        <MayNote act="run.start" />
        {mayMove ? (
          <>
            <Check
              label="I stand at the rig and see the table. The hard-wired stop is within reach."
              value={read}
              onChange={setRead}
              testID="first-move-read"
            />
            {guided.other === null ? null : <Body role="status">{guided.other} is at the first move of this rig already.</Body>}
            {guided.problem === null ? null : <ProblemNotice title="It was not begun" {...guided.problem} />}
            <Button
              kind="primary"
              size="action"
              label="Begin the first move"
              disabled={!read || !ready || guided.other !== null}
              busy={guided.busy}
              onPress={guided.begin}
              testID="begin-guided"
            />
          </>
        ) : null}
      </Section>
    </>
  );
}
