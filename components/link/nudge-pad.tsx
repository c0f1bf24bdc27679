import { useState } from 'react';
import { View } from 'react-native';
import { readDecimal } from '@/components/ui/read-decimal';
import { Body, Button, Check, Field, Label, Panel, ProblemNotice } from '@/components/ui';
import type { GuidedView, LineMessage } from '@/shared/contracts/link';
import { formatDegrees } from '@/shared/lib/format-angle';
import { homingObstacle, isWound } from '@/shared/protocol/homing';
import type { RigMotion } from '@/shared/rig/document';
import { freeTurns, keepOutEntered } from '@/shared/rig/travel';
import type { FirstMove } from './first-move-draft';
import type { StepProps } from './step-props';
import type { GuidedMove } from './use-guided';

interface NudgePadProps {
  motion: RigMotion;
  line: LineMessage;
  guided: GuidedMove;
  move: FirstMove;
}

const orderWords: Record<NonNullable<GuidedView['order']>['state'], string> = {
  sent: 'sent to the controller',
  accepted: 'accepted; it begins at once, or 10 s after the warning',
  moving: 'the table turns',
  done: 'done, the table stands still',
  'cut short': 'cut short.',
  refused: 'refused by the controller:',
};

/** The state of the newest order in words. */
function OrderState({ order }: { order: GuidedView['order'] }) {
  if (order === null) return null;
  const what = order.kind === 'home' ? 'Home' : `Nudge of ${String(order.steps)} microsteps`;
  const bad = order.state === 'cut short' || order.state === 'refused';
  return (
    <Body role="status" tone={bad ? 'danger' : 'text'} testID="order-state">
      {what}: {orderWords[order.state]} {order.detail}
    </Body>
  );
}

/** Turns the table a little, one tap a nudge, both ways. */
export function NudgePad({ motion, line, guided, move }: NudgePadProps) {
  const { draft, set } = move;
  const { mine, whyNot, busy } = guided;
  const longest = mine?.longestNudgeSteps ?? 0;
  const steps = readDecimal(draft.nudgeSteps);
  const usable = steps !== null && Number.isInteger(steps) && steps >= 1 && steps <= longest;
  const angleDeg = line.controller?.angleDeg ?? null;
  const meets = (signed: number) =>
    usable && angleDeg !== null && keepOutEntered(motion, angleDeg, angleDeg + signed / motion.stepsPerDegree) !== null;
  const near = meets(steps ?? 0) || meets(-(steps ?? 0));
  const turn = (signed: number) => {
    guided.nudge(signed, near && draft.intoKeepOut);
    // What was said of one gap does not hold for the next.
    if (!near && draft.intoKeepOut) set({ intoKeepOut: false });
  };
  const off = !usable || whyNot !== '' || mine === null;
  return (
    <Panel className="gap-3" testID="nudge-pad">
      <Field
        label="Microsteps of a nudge"
        value={draft.nudgeSteps}
        onChange={(nudgeSteps) => set({ nudgeSteps })}
        type="number"
        hint={usable ? `${formatDegrees(steps / motion.stepsPerDegree)} by the rig document; at most ${longest}` : undefined}
        error={usable ? undefined : `a whole number from 1 to ${longest}`}
        testID="nudge-steps"
      />
      {near ? (
        <Check
          label="I look at the gap: this nudge may enter an arc that is kept out of runs."
          value={draft.intoKeepOut}
          onChange={(intoKeepOut) => set({ intoKeepOut })}
          testID="into-keep-out"
        />
      ) : null}
      <View className="flex-row gap-3">
        <Button
          className="min-w-0 flex-1"
          size="action"
          label="↺ Nudge"
          accessibilityLabel="Nudge counter-clockwise"
          disabled={off}
          busy={busy}
          onPress={() => turn(steps ?? 0)}
          testID="nudge-ccw"
        />
        <Button
          className="min-w-0 flex-1"
          size="action"
          label="Nudge ↻"
          accessibilityLabel="Nudge clockwise"
          disabled={off}
          busy={busy}
          onPress={() => turn(-(steps ?? 0))}
          testID="nudge-cw"
        />
      </View>
      <Label>Seen from above: ↺ counter-clockwise, the angle grows; ↻ clockwise.</Label>
      <OrderState order={mine?.order ?? null} />
      {whyNot === '' ? null : (
        <Label tone="text" testID="why-not">
          {whyNot}
        </Label>
      )}
      {guided.problem === null ? null : <ProblemNotice title="Nothing was moved" {...guided.problem} />}
    </Panel>
  );
}

/** Finds the home edge, so that angles are known. Where the way to it may not be free, only somebody who looks at it begins. */
export function HomeButton({ rig, line, guided }: Pick<StepProps, 'rig' | 'line' | 'guided'>) {
  const known = line.controller?.positionKnown === true;
  const { motion } = rig.document;
  const angleDeg = line.controller?.angleDeg ?? null;
  const obstacle = homingObstacle(rig.document, angleDeg);
  const mayLook = motion !== undefined && (angleDeg === null || !isWound(motion, angleDeg));
  const what = motion !== undefined && freeTurns(motion) > 0 ? 'the gap, and the cables are not wound up' : 'the gap';
  const [looksAt, setLooksAt] = useState<string | null>(null);
  const looks = obstacle !== null && looksAt === obstacle;
  return (
    <View className="gap-2">
      <Label tone="text">
        {known
          ? `The position is known: ${formatDegrees(line.controller?.angleDeg ?? null)} by the rig document.`
          : 'The position is not known. Nudge the table until it stands near the edge of the home flag, then home: it searches at home speed, towards the edge.'}
      </Label>
      {obstacle === null ? null : (
        <Panel edge="danger" className="gap-3" testID="homing-obstacle">
          <Body>The rig does not home by itself: {obstacle}.</Body>
          {mayLook ? (
            <Check
              label={`I look at ${what}, with Stop under my thumb: home all the same.`}
              value={looks}
              onChange={(on) => setLooksAt(on ? obstacle : null)}
              testID="home-all-the-same"
            />
          ) : null}
        </Panel>
      )}
      <Button
        icon="home"
        label={known ? 'Home again' : 'Home'}
        className="self-start"
        disabled={guided.whyNot !== '' || guided.mine === null || (obstacle !== null && !looks)}
        busy={guided.busy}
        onPress={() => guided.home(looks)}
        testID="home"
      />
    </View>
  );
}
