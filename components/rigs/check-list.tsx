import { View } from 'react-native';
import { Body, Icon, Label, Num, Panel } from '@/components/ui';
import type { StartCheck } from '@/shared/contracts/rigs';
import { figureWords } from './figure-words';

const marks = {
  pass: { icon: 'passed', tone: 'good', said: 'passes' },
  fail: { icon: 'failed', tone: 'danger', said: 'stands against a start' },
  note: { icon: 'note', tone: 'lamp', said: 'to be noted' },
} as const;

const order = { fail: 0, note: 1, pass: 2 } as const;

/** The start checks with what each has measured, those that stand against a start first. */
export function CheckList({ checks }: { checks: readonly StartCheck[] }) {
  const sorted = [...checks].sort((a, b) => order[a.state] - order[b.state]);
  return (
    <Panel className="py-1" testID="start-checks">
      {sorted.map((check, index) => (
        <View
          key={`${check.code} ${String(index)}`}
          className={`flex-row items-start gap-3 py-3 ${index === 0 ? '' : 'border-t border-line'}`}
          testID={`check-${check.code}`}
        >
          <Icon name={marks[check.state].icon} tone={marks[check.state].tone} label={marks[check.state].said} />
          <View className="min-w-0 flex-1">
            <Body strong>{check.title}</Body>
            <Label>{check.detail}</Label>
            {check.figures.length === 0 ? null : <FigureLine figures={check.figures} />}
          </View>
        </View>
      ))}
    </Panel>
  );
}

function FigureLine({ figures }: Pick<StartCheck, 'figures'>) {
  return (
    <View className="flex-row flex-wrap gap-x-5 pt-0.5">
      {figures.map((figure) => (
        <Label key={figure.name}>
          {figure.name}{' '}
          <Num size={13} tone="text">
            {figureWords(figure)}
          </Num>
        </Label>
      ))}
    </View>
  );
}
