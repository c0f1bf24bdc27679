import { View } from 'react-native';
import { serverNowMs } from '@/components/api';
import { useNow } from '@/components/runs/use-now';
import { Body, Icon, Label, Loading, Num, Panel, Section } from '@/components/ui';
import type { LineMessage } from '@/shared/contracts/link';
import { healthRows, inputRows, marks, type HealthRow } from './line-words';

/** How well the line works, in plain words with units; says what to do where something is wrong. */
export function HealthPanel({ line }: { line: LineMessage | null }) {
  // Ages go on while nothing arrives.
  useNow(1000);
  return (
    <Section title="Health of the line in use">
      {line === null ? (
        <Loading label="Listening to the line" />
      ) : (
        <Panel className="gap-2" testID="line-health">
          {healthRows(line, serverNowMs()).map((row) => (
            <HealthLine key={row.label} row={row} />
          ))}
        </Panel>
      )}
    </Section>
  );
}

function HealthLine({ row }: { row: HealthRow }) {
  const { icon, tone } = marks[row.state];
  return (
    <View className="gap-0.5">
      <View className="flex-row items-start gap-2">
        <View className="pt-0.5">
          <Icon name={icon} size={16} tone={tone} />
        </View>
        <Body size={13} tone="dim" className="w-[128px]">
          {row.label}
        </Body>
        <Num className="min-w-0 flex-1" aside={row.aside}>
          {row.value}
        </Num>
      </View>
      {row.advice === '' ? null : (
        <Body size={13} tone={row.state === 'bad' ? 'danger' : 'text'} className="pl-6">
          {row.advice}
        </Body>
      )}
    </View>
  );
}

/** What the controller's inputs say at this moment. */
export function InputsPanel({ line }: { line: LineMessage | null }) {
  const controller = line?.controller ?? null;
  return (
    <Section title="Inputs">
      <Panel className="flex-row flex-wrap gap-x-5 gap-y-2" testID="line-inputs">
        {controller === null ? (
          <Label>Not known: the controller has not answered.</Label>
        ) : (
          inputRows(controller).map((row) => (
            <View key={row.label} className="min-w-[140px] flex-row items-start gap-2">
              <View className="pt-0.5">
                <Icon name={marks[row.state].icon} size={16} tone={marks[row.state].tone} />
              </View>
              <Body size={13} className="shrink">
                <Body size={13} tone="dim">
                  {row.label}
                </Body>{' '}
                {row.words}
              </Body>
            </View>
          ))
        )}
      </Panel>
    </Section>
  );
}
