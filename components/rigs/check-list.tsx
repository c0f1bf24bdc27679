import { View } from 'react-native';
import { Body, Icon, Label, Panel } from '@/components/ui';
import type { StartCheck } from '@/shared/contracts/rigs';

const marks = {
  pass: { icon: 'passed', tone: 'good', said: 'passes' },
  fail: { icon: 'failed', tone: 'danger', said: 'stands against a start' },
  note: { icon: 'note', tone: 'lamp', said: 'to be noted' },
} as const;

const order = { fail: 0, note: 1, pass: 2 } as const;

/** The start checks, those that stand against a start first. */
export function CheckList({ checks }: { checks: readonly StartCheck[] }) {
  const sorted = [...checks].sort((a, b) => order[a.state] - order[b.state]);
  return (
    <Panel className="py-1" testID="start-checks">
      {sorted.map((check, index) => (
        <View
          key={check.code}
          className={`flex-row items-start gap-3 py-3 ${index === 0 ? '' : 'border-t border-line'}`}
          testID={`check-${check.code}`}
        >
          <Icon name={marks[check.state].icon} tone={marks[check.state].tone} label={marks[check.state].said} />
          <View className="flex-1">
            <Body strong>{check.title}</Body>
            <Label>{check.detail}</Label>
          </View>
        </View>
      ))}
    </Panel>
  );
}
