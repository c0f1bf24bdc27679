import { View } from 'react-native';
import { Body, Button, Panel } from '@/components/ui';
import { NudgePad } from './nudge-pad';
import type { StepProps } from './step-props';

/** Step 1: a few microsteps, and the person says which way the table turned. */
export function DirectionStep(props: StepProps) {
  const { guided, move } = props;
  const order = guided.mine?.order ?? null;
  const asked = order?.kind === 'nudge' && order.state === 'done' ? (order.steps ?? 0) : 0;
  const say = (turned: 'ccw' | 'cw' | 'still') =>
    move.set({ direction: turned === 'still' ? 'still' : (turned === 'ccw') === asked > 0 ? 'right' : 'wrong' });
  return (
    <View className="gap-4">
      <Body>
        A few microsteps only: the table hardly moves, and you see which way. Watch a source mass against something that stands still, then
        nudge.
      </Body>
      <NudgePad {...props} />
      {asked === 0 ? null : (
        <Panel className="gap-3" testID="direction-question">
          <Body strong>Which way did the table turn, seen from above?</Body>
          <View className="flex-row flex-wrap gap-2">
            <Button label="↺ Counter-clockwise" onPress={() => say('ccw')} testID="turned-ccw" />
            <Button label="↻ Clockwise" onPress={() => say('cw')} testID="turned-cw" />
            <Button label="It did not turn" onPress={() => say('still')} testID="turned-not" />
          </View>
        </Panel>
      )}
      <DirectionAnswer {...props} />
    </View>
  );
}

function DirectionAnswer({ move }: StepProps) {
  const { direction } = move.draft;
  if (direction === null) return null;
  if (direction === 'right')
    return (
      <Panel edge="good" className="gap-3" testID="direction-answer">
        <Body role="status">Right: the table turns the way it is asked. Angles grow counter-clockwise.</Body>
        <Button label="Go on to steps per degree" className="self-start" onPress={() => move.set({ step: 'steps' })} testID="to-steps" />
      </Panel>
    );
  return (
    <Panel edge="danger" className="gap-2" testID="direction-answer">
      {direction === 'wrong' ? (
        <>
          <Body strong role="status">
            Wrong way round: limits and home flag would guard the wrong side. Move nothing further.
          </Body>
          <Body>
            Press the hard-wired stop and wait until the motor supply is off. Swap the two wires of one coil of the motor (one pair only),
            for example A+ with A−. Switch on, arm again, and repeat this step. The rig document has no sign to turn round, so that nobody
            can undo it from afar.
          </Body>
        </>
      ) : (
        <>
          <Body strong role="status">
            It did not turn, though the controller counted the steps.
          </Body>
          <Body>
            Try more microsteps first. Then, with the motor supply off: is the motor plugged in, is a coil pair crossed between the two
            coils, is the driver enabled, does the belt slip, is the table clamped?
          </Body>
        </>
      )}
    </Panel>
  );
}
