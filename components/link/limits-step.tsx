import { View } from 'react-native';
import { useMay } from '@/components/api';
import { MayNote } from '@/components/people/may-note';
import { Body, Button, Icon, Label, Num, Panel, ProblemNotice, Row, Section } from '@/components/ui';
import { formatFixed, withUnit } from '@/shared/lib/format-number';
import { homeSpeedDegS } from '@/shared/protocol/durations';
import { compareLimits, freeTurns, travelWithTurns, type LimitRow } from '@/shared/rig/travel';
import type { StepProps } from './step-props';

const stateWords: Record<LimitRow['state'], string> = {
  same: 'same',
  wider: 'the controller allows more',
  tighter: 'the controller allows less',
};

const amount = (value: number, unit: string) => withUnit(formatFixed(value, { decimals: 3 }), unit);

/** Step 4: the limits of the rig document are written to the controller, which then guards them by itself. */
export function LimitsStep({ rig, etag, motion, line, guided }: StepProps) {
  const may = useMay('rig.edit').ok;
  const { limits } = line;
  const { leastDeg: minDeg, greatestDeg: maxDeg } = travelWithTurns(motion);
  const documented = { ...motion, minDeg, maxDeg, homeSpeed_deg_s: homeSpeedDegS(motion) };
  const turns = freeTurns(motion);
  const rows = limits === null ? [] : compareLimits(limits, documented, motion.stepsPerDegree);
  const same = rows.length > 0 && rows.every(({ state }) => state === 'same');
  return (
    <View className="gap-4">
      <Body>The controller refuses whatever lies outside its own limits, whatever the server thinks. It keeps them without power.</Body>
      <Section title={`Controller and revision ${rig.revision}`}>
        <Panel testID="limit-rows">
          {rows.length === 0 ? <Label>The controller has not told its limits yet.</Label> : null}
          {rows.map((row, index) => (
            <LimitLine key={row.name} row={row} last={index === rows.length - 1} />
          ))}
        </Panel>
        {turns === 0 ? null : (
          <Label>
            The angles include the turns that the cables stand, {turns} to either side (motion.turnsLimit): a rotation needs them.
          </Label>
        )}
        {rows.length === 0 ? null : (
          <Body role="status" testID="limits-state">
            {same ? 'The controller has the limits of the rig document.' : 'The controller has other limits than the rig document.'}
          </Body>
        )}
        <MayNote act="rig.edit" />
        {guided.problem === null ? null : <ProblemNotice title="The limits were not written" {...guided.problem} />}
        {guided.whyNot === '' ? null : <Label tone="text">{guided.whyNot}</Label>}
        {may ? (
          <Button
            kind={same ? 'plain' : 'primary'}
            size="action"
            label="Write the limits to the controller"
            disabled={guided.whyNot !== '' || guided.mine === null || rows.length === 0}
            busy={guided.busy}
            onPress={() => guided.teach(etag)}
            testID="teach"
          />
        ) : null}
      </Section>
    </View>
  );
}

function LimitLine({ row, last }: { row: LimitRow; last: boolean }) {
  const icon = row.state === 'same' ? 'passed' : row.state === 'wider' ? 'warning' : 'note';
  const tone = row.state === 'same' ? 'good' : row.state === 'wider' ? 'danger' : 'lamp';
  return (
    <Row last={last}>
      <Icon name={icon} size={18} tone={tone} />
      <View className="min-w-0 flex-1">
        <Body>{row.label}</Body>
        <Num aside={row.state === 'same' ? stateWords.same : `document ${amount(row.document, row.unit)}: ${stateWords[row.state]}`}>
          {amount(row.controller, row.unit)}
        </Num>
      </View>
    </Row>
  );
}
