import { Pressable, View } from 'react-native';
import { Body, Icon, Label, Num } from '@/components/ui';
import type { ThemeColors } from '@/components/theme';
import { laneOf } from '@/components/charts/strip-model';
import type { Step } from '@/shared/protocol/document';
import type { StepPath } from '@/shared/protocol/step-path';
import { useEditor } from './editor-context';
import { samePath } from './editor-reducer';
import { stepIcons, stepTitle, stepUnder } from './step-words';

interface StepRowProps {
  step: Step;
  path: StepPath;
  documentPath: string;
  /** The one row that Tab reaches; arrows do the rest. */
  tabStop: boolean;
}

/** Where the sources stand after the step, as a colour of the icon; the words say it too. */
function toneOf(step: Step, station: string): keyof ThemeColors {
  if (step.kind !== 'swing' && step.kind !== 'dwell') return step.kind === 'repeat' ? 'lamp' : 'dim';
  const lane = laneOf(station);
  return lane === 'other' ? 'dim' : lane;
}

/** One step: the first tap takes it in hand, the next opens its details. */
export function StepRow({ step, path, documentPath, tabStop }: StepRowProps) {
  const editor = useEditor();
  const span = editor.plan?.spans.get(documentPath);
  const chosen = samePath(path, editor.selected);
  const wrong = (editor.plan?.findings ?? []).some((finding) => finding.path === documentPath);
  const advised = (editor.plan?.advice ?? []).some((advice) => advice.path === documentPath);
  const title = stepTitle(step);
  const under = stepUnder(step, span?.durationS ?? null);
  const mark = wrong ? 'needs correction' : advised ? 'has advice' : '';
  const station = step.kind === 'dwell' && span !== undefined && span.station !== '' ? `, ${span.station}` : '';
  return (
    <Pressable
      role="treeitem"
      aria-level={path.length}
      aria-selected={chosen}
      aria-label={[`${path.join('.')}. ${title}${station}`, under, mark].filter((part) => part !== '').join(', ')}
      tabIndex={tabStop ? 0 : -1}
      onPress={() => (chosen ? editor.openDetails(path) : editor.select(path))}
      testID={`step-${path.join('.')}`}
      {...{ dataSet: { path: path.join('.') } }}
      className={`min-h-[60px] flex-row items-center gap-3 rounded-panel border-2 px-2 py-2 ${chosen ? 'border-lamp bg-panel' : 'border-transparent hover:bg-panel'}`}
    >
      <View className="h-10 w-10 flex-none items-center justify-center rounded-xl bg-panel2">
        <Icon name={stepIcons[step.kind]} tone={toneOf(step, span?.station ?? '')} />
      </View>
      <View className="min-w-0 flex-1">
        <Body strong={step.kind === 'repeat'} size={15}>
          {title}
          {station === '' ? '' : <Body tone="dim">{station}</Body>}
        </Body>
        {under === '' ? null : (
          <Num size={13} tone="dim">
            {under}
          </Num>
        )}
      </View>
      {mark === '' ? null : <Icon name={wrong ? 'warning' : 'note'} tone={wrong ? 'danger' : 'lamp'} size={18} />}
      {chosen ? <Label tone="lamp">Details</Label> : <Icon name="forward" size={16} tone="faint" />}
    </Pressable>
  );
}
