import { SwingStrip } from '@/components/charts/swing-strip';
import { MayNote } from '@/components/people/may-note';
import { Body, Label, Loading, Panel, useWide } from '@/components/ui';
import { formatStepPath, parseStepPath } from '@/shared/protocol/step-path';
import { useEditor } from './editor-context';
import { Figures } from './figures';
import { FindingsList } from './findings-list';
import { NightPanel } from './night-panel';
import { SaveTrouble } from './save-state';
import { StepList } from './step-list';
import { useForecast } from './use-forecast';
import type { DraftSync } from './use-draft-sync';
import type { PlanningRig } from './use-planning-rig';

interface EditorMainProps {
  sync: DraftSync;
  startAt: string;
  planning: PlanningRig;
  /** The draft was found on this device and is newer than the server's. */
  restored: boolean;
}

/** Strip, figures, steps, findings: from the whole to the single step. */
export function EditorMain({ sync, startAt, planning, restored }: EditorMainProps) {
  const { plan, document, timeZone, rig } = useEditor();
  const wide = useWide();
  const forecast = useForecast(plan, document, rig?.document ?? null);
  return (
    <>
      <MayNote act="protocol.write" />
      {restored && sync.state.status !== 'saved' ? <Body role="status">Edits kept on this device were put back.</Body> : null}
      <SaveTrouble sync={sync} />
      {plan === null ? (
        planning.none ? (
          <Panel>
            <Body>No rig in this lab yet. Add one under Rigs: the strip, the finish time and the checks need its numbers.</Body>
          </Panel>
        ) : (
          <Loading label="Loading the rig to plan for" />
        )
      ) : (
        <>
          <Strip />
          <Figures plan={plan} forecast={forecast} timeZone={timeZone} startAt={startAt} />
        </>
      )}
      <StepList />
      {plan === null || rig === null || forecast === null ? null : <NightPanel forecast={forecast} plan={plan} rig={rig.document} />}
      {wide ? null : <FindingsList />}
      <Label className="hidden wide:flex">
        Arrows choose a step, Alt and arrows move it, Enter opens its details, Delete deletes it, Ctrl+Z undoes.
      </Label>
    </>
  );
}

/** The whole protocol as it would run; a tap on it takes the step in hand. */
function Strip() {
  const { plan, timeZone, document, selected, select } = useEditor();
  const wide = useWide();
  if (plan === null) return null;
  const documentPath = selected === null ? null : formatStepPath(document, selected);
  const selectedKey = documentPath === null ? null : (plan.spans.get(documentPath)?.firstKey ?? null);
  return (
    <Panel className="px-3 pb-3 pt-4">
      <SwingStrip
        steps={plan.strip}
        timeZone={timeZone}
        title={document.name}
        predicted={plan.predicted}
        equilibrium={plan.equilibrium}
        selectedKey={selectedKey}
        onSelect={(key) => select(parseStepPath(key))}
        heightPx={wide ? 190 : 132}
      />
    </Panel>
  );
}
