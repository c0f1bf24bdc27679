import { View } from 'react-native';
import { Body, Button, Label, Panel } from '@/components/ui';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatStepPath, stepAt, type StepPath } from '@/shared/protocol/step-path';
import { useEditor } from './editor-context';
import { StepForm } from './forms/step-form';

/** The fields of the step in hand, how long it takes, what is wrong with it and what would be better. */
export function StepDetails({ path }: { path: StepPath }) {
  const editor = useEditor();
  const step = stepAt(editor.document, path);
  if (step === null) return <Body tone="dim">This step is gone.</Body>;
  const documentPath = formatStepPath(editor.document, path) ?? '';
  const span = editor.plan?.spans.get(documentPath);
  const findings = (editor.plan?.findings ?? []).filter((finding) => finding.path === documentPath);
  const advice = (editor.plan?.advice ?? []).filter((each) => each.path === documentPath);
  return (
    <View className="gap-5" testID="step-details">
      {findings.map(({ message }) => (
        <Panel key={message} edge="danger" className="bg-panel2">
          <Body>{message}</Body>
        </Panel>
      ))}
      {advice.map(({ message }) => (
        <Panel key={message} edge="lamp" className="bg-panel2">
          <Body>{message}</Body>
        </Panel>
      ))}
      <StepForm
        key={`${path.join('.')} ${step.kind}`}
        step={step}
        rig={editor.rig?.document ?? null}
        fromDeg={span?.fromDeg ?? null}
        disabled={!editor.mayWrite}
        onChange={(next) => editor.replace(path, next)}
      />
      {span === undefined || (findings.length > 0 && span.durationS === 0) ? null : (
        <Label>
          Takes {formatDuration(span.durationS)} by plan{span.count > 1 ? `, ${span.count} times` : ''}.
        </Label>
      )}
      {editor.mayWrite ? <Structure path={path} repeat={step.kind === 'repeat'} /> : null}
    </View>
  );
}

/** The acts on the step as words, for whoever does not know the icons yet. */
function Structure({ path, repeat }: { path: StepPath; repeat: boolean }) {
  const editor = useEditor();
  return (
    <View className="flex-row flex-wrap gap-2 border-t border-line pt-4">
      <Button icon="up" label="Up" accessibilityLabel="Move up" onPress={editor.moveUp} />
      <Button icon="down" label="Down" accessibilityLabel="Move down" onPress={editor.moveDown} />
      {repeat ? (
        <Button icon="unnest" label="Take steps out" onPress={editor.unnest} />
      ) : (
        <Button icon="nest" label="Into a repeat" onPress={editor.nest} />
      )}
      {!repeat && path.length > 1 ? <Button icon="unnest" label="Out of the repeat" onPress={editor.unnest} /> : null}
      <Button icon="duplicate" label="Duplicate" onPress={editor.duplicate} />
    </View>
  );
}
