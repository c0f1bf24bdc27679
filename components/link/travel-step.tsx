import { View } from 'react-native';
import { PlanView } from '@/components/charts/plan-view';
import { Body, Button, Check, Field, Icon, Label, Num, Panel, Section, useWide } from '@/components/ui';
import { formatDegrees } from '@/shared/lib/format-angle';
import { arcOutside, limitsOfTravel, travelFindings, withTravel, type TaughtTravel } from '@/shared/rig/travel';
import { taughtOf } from './first-move-draft';
import { HomeButton, NudgePad } from './nudge-pad';
import { RevisionButton } from './revision-button';
import type { StepProps } from './step-props';

/** Step 3: the two ends of the travel, found by hand; the limits stay clear of them. */
export function TravelStep(props: StepProps) {
  const { line, guided, move } = props;
  const angleDeg = line.controller?.angleDeg ?? null;
  const { draft, set } = move;
  const mayTake = guided.mine !== null && angleDeg !== null && line.controller?.moving === false;
  return (
    <View className="gap-4">
      <Body>
        Nudge clockwise to the last place where everything is still clear by hand and feeler (2 mm at the glass), and say that it is the
        least; then counter-clockwise to the greatest. Small nudges near the end.
      </Body>
      <HomeButton rig={props.rig} line={line} guided={guided} />
      <NudgePad {...props} />
      <View className="flex-row flex-wrap gap-3">
        <End
          label="This is the least"
          deg={draft.leastDeg}
          disabled={!mayTake}
          onPress={() => set({ leastDeg: angleDeg })}
          testID="this-is-least"
        />
        <End
          label="This is the greatest"
          deg={draft.greatestDeg}
          disabled={!mayTake}
          onPress={() => set({ greatestDeg: angleDeg })}
          testID="this-is-greatest"
        />
      </View>
      <Travel {...props} />
    </View>
  );
}

function End({ label, deg, ...button }: { label: string; deg: number | null; disabled: boolean; onPress: () => void; testID: string }) {
  return (
    <View className="min-w-[150px] flex-1 gap-1">
      <Button label={label} {...button} />
      <Num className="text-center" tone={deg === null ? 'dim' : 'text'} testID={`${button.testID}-deg`}>
        {deg === null ? 'not yet' : formatDegrees(deg)}
      </Num>
    </View>
  );
}

function Travel({ rig, etag, line, move }: StepProps) {
  const wide = useWide();
  const { draft, set } = move;
  const taught = taughtOf(draft);
  const findings = taught === null ? [] : travelFindings(rig.document, taught);
  const refused = findings.find(({ state }) => state === 'refused');
  const document = taught === null || refused !== undefined ? null : withTravel(rig.document, taught, draft.keepRestOut);
  const arc = taught === null ? null : arcOutside(taught);
  return (
    <Section title="Travel">
      <Panel className="gap-3" testID="travel">
        <View className="flex-row flex-wrap items-center gap-5">
          <PlanView rig={document ?? rig.document} angleDeg={line.controller?.angleDeg ?? null} sizePx={wide ? 230 : 150} />
          <TravelWords taught={taught} ok={document !== null} motion={rig.document.motion} />
        </View>
        <Field
          label="Margin between each end and its limit"
          value={draft.marginDeg}
          onChange={(marginDeg) => set({ marginDeg })}
          type="number"
          unit="°"
          error={refused?.field === 'marginDeg' ? refused.message : undefined}
          testID="margin-deg"
        />
        {arc === null ? null : (
          <Check
            label={`Keep ${formatDegrees(arc[0])} to ${formatDegrees(arc[1])} out of runs (drawn dashed, for either source)`}
            value={draft.keepRestOut}
            onChange={(keepRestOut) => set({ keepRestOut })}
            testID="keep-rest-out"
          />
        )}
        {findings
          .filter(({ field, state }) => state === 'note' || field !== 'marginDeg')
          .map(({ message, state }) => (
            <View key={message} className="flex-row items-start gap-2">
              <Icon name={state === 'refused' ? 'failed' : 'note'} size={16} tone={state === 'refused' ? 'danger' : 'lamp'} />
              <Body size={13} className="shrink" tone={state === 'refused' ? 'danger' : 'text'}>
                {message}
              </Body>
            </View>
          ))}
        {document === null || taught === null ? null : (
          <RevisionButton
            {...{ rig, etag, document }}
            reason={`Travel taught by hand: ends at ${formatDegrees(taught.leastDeg)} and ${formatDegrees(taught.greatestDeg)}, margin ${draft.marginDeg}°.`}
            onMade={() => set({ step: 'limits' })}
            testID="revise-travel"
          />
        )}
      </Panel>
    </Section>
  );
}

function TravelWords({ taught, ok, motion }: { taught: TaughtTravel | null; ok: boolean; motion: StepProps['motion'] | undefined }) {
  const limits = taught === null || !ok ? null : limitsOfTravel(taught);
  return (
    <View className="min-w-[150px] flex-1 gap-2">
      <View>
        <Label>Limits in the rig document</Label>
        <Num tone="dim">{motion === undefined ? '–' : `${formatDegrees(motion.minDeg)} to ${formatDegrees(motion.maxDeg)}`}</Num>
      </View>
      <View>
        <Label>Limits as taught</Label>
        <Num size={17} testID="taught-limits">
          {limits === null ? 'both ends first' : `${formatDegrees(limits.minDeg)} to ${formatDegrees(limits.maxDeg)}`}
        </Num>
      </View>
    </View>
  );
}
