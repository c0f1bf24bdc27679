import { useState } from 'react';
import { View } from 'react-native';
import { useLab, useLabMutation, useMay, wordsOf } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Body, Button, Icon, Label, Panel, ProblemNotice, Section } from '@/components/ui';
import { type RigView } from '@/shared/contracts/rigs';
import { disarm } from '@/shared/contracts/standing';
import { formatClockWithZone } from '@/shared/lib/format-time';
import { ArmSheet } from './arm-sheet';
import { ArmingProgress, VirtualInputsPanel, WhyDisarmed } from './arming-progress';
import { useRefreshRigs } from './use-rig';

/** Who answers for the rig on site, until when; the way to arm and to end it. */
export function ArmPanel({ rig }: { rig: RigView }) {
  const [arming, setArming] = useState(false);
  const mayArm = useMay('rig.arm').ok;
  return (
    <Section title="Arm">
      <Panel className="gap-3" edge={rig.arm === null && rig.arming === null ? undefined : 'lamp'}>
        <ArmState rig={rig} />
        <MayNote act="rig.arm" />
        {mayArm && rig.arm === null && rig.arming === null ? (
          <Button icon="key" label="Arm the rig" className="self-start" onPress={() => setArming(true)} testID="arm" />
        ) : null}
        {mayArm && rig.arm !== null ? <Disarm rig={rig} /> : null}
      </Panel>
      <VirtualInputsPanel rig={rig} />
      {arming ? <ArmSheet rig={rig} onClose={() => setArming(false)} /> : null}
    </Section>
  );
}

function ArmState({ rig }: { rig: RigView }) {
  if (rig.arm !== null) return <Armed arm={rig.arm} />;
  if (rig.arming !== null) return <ArmingProgress rig={rig} arming={rig.arming} />;
  return (
    <View className="gap-2">
      <Body tone="dim">
        Not armed. A run starts only on a rig that a named person has armed on site, until after the finish. Hold and stop never need it.
      </Body>
      <WhyDisarmed disarmed={rig.disarmed} />
    </View>
  );
}

function Armed({ arm }: { arm: NonNullable<RigView['arm']> }) {
  const { timeZone } = useLab();
  return (
    <View className="flex-row items-start gap-3">
      <Icon name="key" tone="lamp" />
      <View className="flex-1 gap-1">
        <Body strong testID="armed-by">
          Armed by {arm.name}
        </Body>
        <Body tone="dim">until {formatClockWithZone(Date.parse(arm.until), { timeZone, weekday: true })}</Body>
        {arm.note === '' ? null : <Body>“{arm.note}”</Body>}
      </View>
    </View>
  );
}

function Disarm({ rig }: { rig: RigView }) {
  const refresh = useRefreshRigs();
  const end = useLabMutation(disarm, refresh);
  return (
    <View className="gap-2">
      {end.isError ? <ProblemNotice title="The rig is still armed" {...wordsOf(end.error)} /> : null}
      <Button
        label="Disarm"
        className="self-start"
        busy={end.isPending}
        onPress={() => end.mutate({ params: { rigId: rig.id } })}
        testID="disarm"
      />
      {rig.activeRun === null ? null : <Label>A run that goes on is held at once, until the rig is armed again.</Label>}
    </View>
  );
}
