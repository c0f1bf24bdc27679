import { View } from 'react-native';
import { serverNowMs, useLab, useLabMutation, useMay, wordsOf } from '@/components/api';
import { useNow } from '@/components/runs/use-now';
import { Body, Button, Icon, Label, Num, Panel, ProblemNotice } from '@/components/ui';
import { type RigView } from '@/shared/contracts/rigs';
import { disarm, turnVirtual, type ArmingView, type DisarmedView } from '@/shared/contracts/standing';
import { formatCountdown } from '@/shared/lib/format-duration';
import { formatDayAndClock } from '@/shared/lib/format-time';
import { useRefreshRigs } from './use-rig';

const stages: Record<ArmingView['stage'], { title: string; words: string }> = {
  'key-off': {
    title: 'Turn the arm key off first',
    words: 'It is on from before and does not say that anybody is there. Turn it off on the controller, then on again.',
  },
  'key-on': {
    title: 'Turn the arm key on',
    words: 'On the controller, at the rig. Look once more: nobody and nothing in the swept circle.',
  },
  leave: {
    title: 'Leave the room and close the door',
    words: 'When the time is over the door must be closed; otherwise the rig is not armed. The key stays on.',
  },
};

/** Arming as it goes on: the key, then the exit delay with its countdown. */
export function ArmingProgress({ rig, arming }: { rig: Pick<RigView, 'id' | 'name' | 'live'>; arming: ArmingView }) {
  useNow(500);
  const refresh = useRefreshRigs();
  const end = useLabMutation(disarm, refresh);
  const mayArm = useMay('rig.arm').ok;
  const { title, words } = stages[arming.stage];
  const leftS = Math.max(0, (Date.parse(arming.endsAt) - serverNowMs()) / 1000);
  const open = rig.live.interlockClosed === false;
  return (
    <View className="gap-2" testID="arming">
      <View className="flex-row items-center justify-between gap-3">
        <Body strong role="status" className="shrink">
          {title}
        </Body>
        <Num size={24} light testID="arming-left">
          {formatCountdown(leftS)}
        </Num>
      </View>
      <Body>{words}</Body>
      {arming.stage === 'leave' ? (
        <View className="flex-row items-center gap-2">
          <Icon name={open ? 'warning' : 'passed'} size={16} tone={open ? 'danger' : 'good'} />
          <Label tone="text">{open ? 'The door is open now.' : 'The door is closed now.'}</Label>
        </View>
      ) : null}
      <Label>{arming.name} will answer for the rig.</Label>
      {end.isError ? <ProblemNotice title="Arming goes on" {...wordsOf(end.error)} /> : null}
      {mayArm ? (
        <Button
          label="End arming"
          className="self-start"
          busy={end.isPending}
          onPress={() => end.mutate({ params: { rigId: rig.id } })}
          testID="end-arming"
        />
      ) : null}
    </View>
  );
}

/** Why the rig is not armed any more, or why it did not come to it. */
export function WhyDisarmed({ disarmed }: { disarmed: DisarmedView | null }) {
  const { timeZone } = useLab();
  if (disarmed === null) return null;
  return (
    <Label tone="text" testID="disarmed">
      Not armed since {formatDayAndClock(Date.parse(disarmed.at), timeZone)} ({disarmed.name}): {disarmed.why}.
    </Label>
  );
}

/** Arm key and door of a rig that is part of this server; a real rig has real ones, and this panel is not shown. */
export function VirtualInputsPanel({ rig }: { rig: Pick<RigView, 'id' | 'link' | 'live'> }) {
  const refresh = useRefreshRigs();
  const turn = useLabMutation(turnVirtual, refresh);
  const mayArm = useMay('rig.arm').ok;
  const virtual = rig.link.kind === 'simulated' || rig.link.kind === 'board';
  if (!virtual || !mayArm || rig.live.armKey === null) return null;
  const { armKey, interlockClosed } = rig.live;
  const params = { rigId: rig.id };
  return (
    <Panel className="gap-3 border border-dashed border-line" testID="virtual-inputs">
      <View>
        <Body strong>Virtual key and door</Body>
        <Label>This rig is simulated and stands in no room. A real one has its key on the controller and its switch at the door.</Label>
      </View>
      <View className="flex-row flex-wrap gap-3">
        <Button
          icon="key"
          label={armKey ? 'Turn the virtual key off' : 'Turn the virtual key on'}
          busy={turn.isPending}
          onPress={() => turn.mutate({ params, body: { armKey: armKey ? 'off' : 'on' } })}
          testID="virtual-key"
        />
        <Button
          label={interlockClosed === true ? 'Open the virtual door' : 'Close the virtual door'}
          busy={turn.isPending}
          onPress={() => turn.mutate({ params, body: { door: interlockClosed === true ? 'open' : 'closed' } })}
          testID="virtual-door"
        />
      </View>
      {turn.isError ? <ProblemNotice title="Nothing was turned" {...wordsOf(turn.error)} /> : null}
    </Panel>
  );
}
