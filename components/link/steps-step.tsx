import { View } from 'react-native';
import { Body, Button, Field, Label, Num, Panel, Section, Tabs } from '@/components/ui';
import { formatDegrees } from '@/shared/lib/format-angle';
import { formatPercent, formatSignificant } from '@/shared/lib/format-number';
import { formatUncertain } from '@/shared/lib/format-uncertain';
import { compareSteps, roundedTo, stepsBetweenEdges, type StepsPerDegree, type TurnReading } from '@/shared/rig/steps-per-degree';
import { readTurn, resultOf, stepsSinceMark } from './first-move-draft';
import { HomeButton, NudgePad } from './nudge-pad';
import { RevisionButton } from './revision-button';
import type { StepProps } from './step-props';

/** Step 2: microsteps per degree, by a turn that the person reads or by passes of the flag's edge. */
export function StepsStep(props: StepProps) {
  const { move } = props;
  const { draft, set } = move;
  return (
    <View className="gap-4">
      <Tabs
        label="How the turn is measured"
        value={draft.method}
        options={[
          { value: 'mark', label: 'A marked turn' },
          { value: 'edge', label: 'Edge to edge' },
        ]}
        onChange={(method) => set({ method })}
        testID="steps-method"
      />
      {draft.method === 'mark' ? <MarkedTurn {...props} /> : <EdgeToEdge {...props} />}
      <Readings {...props} />
    </View>
  );
}

function MarkedTurn(props: StepProps) {
  const { guided, move } = props;
  const { draft, set } = move;
  const count = guided.mine?.count ?? null;
  const steps = stepsSinceMark(draft, count);
  const lost = draft.mark !== null && steps === null;
  const turn = readTurn(steps, { deg: draft.turnedDeg, uDeg: draft.uDeg });
  return (
    <>
      <Body>
        Come to a mark on the table from the side you will go on to, so that no play is left. Begin the turn there, nudge on in the same
        direction to another mark, and enter the angle between the two. The further, the better.
      </Body>
      <Button
        label={draft.mark === null ? 'Begin the turn here' : 'Begin the turn anew here'}
        className="self-start"
        disabled={count === null}
        onPress={() => set({ mark: count })}
        testID="mark-here"
      />
      {lost ? (
        <Body tone="danger" role="alert">
          Nobody knows how far the table went meanwhile. Begin the turn anew at a mark.
        </Body>
      ) : null}
      <NudgePad {...props} />
      {steps === null ? null : <TurnEntry steps={steps} turn={turn} {...props} fields={{ deg: 'turnedDeg', uDeg: 'uDeg' }} />}
    </>
  );
}

function EdgeToEdge(props: StepProps) {
  const { line, guided, move } = props;
  const edges = guided.mine?.edges ?? [];
  const steps = stepsBetweenEdges(edges);
  const turn = readTurn(steps, { deg: move.draft.edgeDeg, uDeg: move.draft.edgeUDeg });
  return (
    <>
      <Body>
        The controller counts each pass of the home flag’s edge. Home, then nudge over the edge and on in one direction until it is passed
        again: a whole turn is 360°. Where the flag has two edges, enter the angle between them instead. The travel must be free all round.
      </Body>
      <HomeButton rig={props.rig} line={line} guided={guided} />
      <NudgePad {...props} />
      <Label tone="text" testID="edge-passes">
        {edges.length === 0
          ? 'No pass of the edge yet.'
          : `Passes of the edge: ${edges.map((pass) => `${String(pass.steps)} ${pass.direction === 'ccw' ? '↺' : '↻'}`).join(', ')} microsteps from home.`}
      </Label>
      {steps === null ? null : <TurnEntry steps={steps} turn={turn} {...props} fields={{ deg: 'edgeDeg', uDeg: 'edgeUDeg' }} />}
    </>
  );
}

interface TurnEntryProps extends StepProps {
  steps: number;
  turn: ReturnType<typeof readTurn>;
  fields: { deg: 'turnedDeg' | 'edgeDeg'; uDeg: 'uDeg' | 'edgeUDeg' };
}

/** The steps of a turn, the angle that belongs to them, and its place among the readings. */
function TurnEntry({ steps, turn, fields, move, motion }: TurnEntryProps) {
  const { draft, set } = move;
  const typed = draft[fields.deg] !== '' && draft[fields.uDeg] !== '';
  const error = (field: string) => ('message' in turn && turn.field === field && typed ? turn.message : undefined);
  const add = (reading: TurnReading) =>
    set({ readings: [...draft.readings, reading], mark: null, ...(fields.deg === 'turnedDeg' ? { turnedDeg: '' } : {}) });
  return (
    <Panel className="gap-3" testID="turn-entry">
      <View>
        <Label>Turned since the beginning</Label>
        <Num
          size={24}
          light
          aside={`microsteps, ${formatDegrees(steps / motion.stepsPerDegree)} by the rig document`}
          testID="turned-steps"
        >
          {String(steps).replace('-', '−')}
        </Num>
      </View>
      <Field
        label="Angle between the two, as read"
        value={draft[fields.deg]}
        onChange={(text) => set({ [fields.deg]: text })}
        type="number"
        unit="°"
        error={error('turnedDeg') ?? error('steps')}
        testID="turned-deg"
      />
      <Field
        label="Standard uncertainty of it"
        value={draft[fields.uDeg]}
        onChange={(text) => set({ [fields.uDeg]: text })}
        type="number"
        unit="°"
        hint="Half the finest division that you could still tell, divided by 1.7; for both marks together times 1.4."
        error={error('uDeg')}
        testID="turned-u"
      />
      <Button
        label="Take this turn"
        disabled={!('reading' in turn)}
        onPress={() => ('reading' in turn ? add(turn.reading) : undefined)}
        testID="take-turn"
      />
    </Panel>
  );
}

function Readings(props: StepProps) {
  const { move, motion, rig, etag } = props;
  const { readings } = move.draft;
  const result = resultOf(move.draft);
  if (result === null) return null;
  const value = roundedTo(result);
  const document =
    rig.document.motion === undefined ? null : { ...rig.document, motion: { ...rig.document.motion, stepsPerDegree: value } };
  return (
    <Section title="Steps per degree">
      <Panel className="gap-3" testID="steps-result">
        {readings.map((reading, index) => (
          <View key={`${String(index)} ${String(reading.steps)}`} className="flex-row items-center justify-between gap-3">
            <Num className="min-w-0 flex-1" aside={`± ${formatSignificant(reading.uDeg, 2)}°`}>
              {String(reading.steps).replace('-', '−')} in {formatDegrees(reading.turnedDeg, 3)}
            </Num>
            <Button
              kind="quiet"
              label="Remove"
              accessibilityLabel={`Remove turn ${index + 1}`}
              onPress={() => move.set({ readings: readings.filter((_, other) => other !== index) })}
            />
          </View>
        ))}
        <Num size={30} light aside="microsteps per degree" testID="steps-per-degree">
          {formatUncertain({ value: result.value, u: result.u })}
        </Num>
        <Comparison result={result} documented={motion.stepsPerDegree} widened={result.widenedBy > 2} />
        {value === motion.stepsPerDegree ? null : (
          <RevisionButton
            {...{ rig, etag, document }}
            reason={`Steps per degree ${formatUncertain({ value: result.value, u: result.u })} from ${readings.length === 1 ? 'one turn' : `${readings.length} turns`} at the first move.`}
            onMade={() => move.set({ step: 'travel' })}
            testID="revise-steps"
          />
        )}
      </Panel>
    </Section>
  );
}

function Comparison({ result, documented, widened }: { result: StepsPerDegree; documented: number; widened: boolean }) {
  const { share, uShare, agree, missAt90Deg } = compareSteps(result, documented);
  return (
    <View className="gap-1">
      <Body testID="steps-comparison">
        The rig document says {formatSignificant(documented, 6)}. {agree ? 'They agree' : 'They differ'}: {formatPercent(share)} ±{' '}
        {formatPercent(uShare)}.{agree ? '' : ` A move of 90° would miss by ${formatDegrees(missAt90Deg)}.`}
      </Body>
      {widened ? (
        <Body tone="danger">
          The turns contradict each other by more than they claim to be uncertain; u was widened. Look for play or a slipping belt.
        </Body>
      ) : null}
    </View>
  );
}
