import { useState } from 'react';
import { Pressable, View } from 'react-native';
import { Body, Icon, Label, Sheet, Tabs } from '@/components/ui';
import type { Step, StepKind } from '@/shared/protocol/document';
import { newStep } from '@/shared/protocol/new-step';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';
import { useEditor } from './editor-context';
import { kindNames, kindUses, stepIcons, stepTitle } from './step-words';

const kinds: readonly StepKind[] = ['swing', 'dwell', 'kick', 'rotate', 'repeat', 'settle', 'wait', 'proof', 'prompt', 'home', 'mark'];

/** A repeat with nothing in it cannot be saved, so a new one begins with a pair; a first swing goes to the other side than the last. */
function freshStep(kind: StepKind, rig: RigDocument, lastTarget: string): Step {
  const beat: Step = rig.measured?.period_s === undefined ? { kind: 'dwell', for_s: 900 } : { kind: 'dwell', beat_periods: 2 };
  if (kind === 'repeat') return { kind, times: 8, steps: [{ kind: 'swing', to: 'far' }, beat, { kind: 'swing', to: 'near' }, beat] };
  if (kind === 'swing' && rig.stations['near'] !== undefined && rig.stations['far'] !== undefined)
    return { kind, to: lastTarget === 'near' ? 'far' : 'near' };
  if (kind === 'dwell' && lastTarget !== '') return beat;
  return newStep(kind, rig);
}

const lastTargetBefore = (step: Step | null): string => (step?.kind === 'swing' && typeof step.to === 'string' ? step.to : '');

/** The kinds of step, each with what it is for. Without a rig the new step has the values that suit the wide example. */
export function AddStepSheet({ rig, onClose }: { rig: RigDocument | null; onClose: () => void }) {
  const editor = useEditor();
  const isRepeat = editor.selectedStep?.kind === 'repeat';
  const [place, setPlace] = useState<'after' | 'inside'>(isRepeat ? 'inside' : 'after');
  const reference = editor.selectedStep ?? editor.document.steps.at(-1) ?? null;
  const where =
    editor.selectedStep === null
      ? 'At the end of the protocol.'
      : place === 'inside'
        ? `At the end of “${stepTitle(editor.selectedStep)}”.`
        : `After “${stepTitle(editor.selectedStep)}”.`;
  const add = (kind: StepKind) => {
    editor.insert(freshStep(kind, rig ?? demoRigWide, lastTargetBefore(reference)), place);
    onClose();
  };
  return (
    <Sheet open title="Add a step" onClose={onClose} testID="add-step-sheet">
      {isRepeat ? (
        <Tabs
          label="Where"
          value={place}
          options={[
            { value: 'inside', label: 'Inside' },
            { value: 'after', label: 'After' },
          ]}
          onChange={setPlace}
        />
      ) : null}
      <Label>{where}</Label>
      <View>
        {kinds.map((kind) => (
          <Pressable
            key={kind}
            role="button"
            aria-label={`Add ${kindNames[kind]}: ${kindUses[kind] ?? ''}`}
            onPress={() => add(kind)}
            testID={`add-${kind}`}
            className="-mx-2 min-h-action flex-row items-center gap-4 rounded-panel px-2 py-2 hover:bg-panel2"
          >
            <View className="h-10 w-10 items-center justify-center rounded-xl bg-panel2">
              <Icon name={stepIcons[kind]} tone="lamp" />
            </View>
            <View className="flex-1">
              <Body strong>{kindNames[kind]}</Body>
              <Label>{kindUses[kind]}</Label>
            </View>
          </Pressable>
        ))}
      </View>
    </Sheet>
  );
}
