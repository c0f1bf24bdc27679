import { View } from 'react-native';
import { Button, Field, Label, Tabs } from '@/components/ui';
import type { TopicDraft } from './broker-draft';

interface TopicFormProps {
  topic: TopicDraft;
  /** Its place among the topics, and whether it is the only one. */
  index: number;
  only: boolean;
  onChange: (topic: TopicDraft) => void;
  onRemove: () => void;
  /** By field of the contract. */
  errors: Readonly<Record<string, string>>;
}

/** What is read out of the messages of a topic, and the channel it goes into. */
export function TopicForm({ topic, index, only, onChange, onRemove, errors }: TopicFormProps) {
  const set = (key: keyof TopicDraft) => (text: string) => onChange({ ...topic, [key]: text });
  const error = (path: string) => errors[`topics.${String(index)}.${path}`];
  const text = (
    key: 'filter' | 'channel' | 'unit' | 'valuePath' | 'timePath',
    label: string,
    more: { hint?: string; error?: string | undefined },
  ) => <Field label={label} value={topic[key]} onChange={set(key)} testID={`broker-${key}`} {...more} />;
  return (
    <View
      className={index === 0 ? 'gap-4' : 'gap-4 border-t border-line pt-4'}
      role="group"
      aria-label={`Topic ${String(index + 1)}`}
      testID="broker-topic-form"
    >
      {text('filter', 'Topic', { hint: '+ stands for one level, # for all that follow.', error: error('filter') })}
      <Tabs
        label="What it measures"
        value={topic.role}
        options={[
          { value: 'environment', label: 'The room' },
          { value: 'deflection', label: 'Deflection' },
        ]}
        onChange={(role) => onChange({ ...topic, role })}
      />
      {text('channel', 'Channel', { error: error('channel.name') })}
      {text('unit', 'Unit', { error: error('channel.unit') })}
      <Field
        label="Samples a second to expect"
        value={topic.rate}
        onChange={set('rate')}
        type="number"
        unit="Hz"
        error={error('channel.rateHz')}
      />
      {text('valuePath', 'Where the number is', {
        hint: 'In a JSON message, such as sensor.value or values[0]. Empty: the message is the number.',
        error: error('valuePath'),
      })}
      <Tabs
        label="Time of the measurement"
        value={topic.form}
        options={[
          { value: 'arrival', label: 'On arrival' },
          { value: 'iso', label: 'ISO, UTC' },
          { value: 's', label: 'Epoch s' },
          { value: 'ms', label: 'Epoch ms' },
          { value: 'us', label: 'Epoch µs' },
        ]}
        onChange={(form) => onChange({ ...topic, form })}
      />
      {topic.form === 'arrival' ? (
        <Label>What the broker kept from before is refused then: nobody knows when it was measured.</Label>
      ) : (
        text('timePath', 'Where the time is', { error: error('time.path') })
      )}
      <Field
        label="Standard uncertainty of the time"
        value={topic.timeU}
        onChange={set('timeU')}
        type="number"
        unit="s"
        error={error('timeUS')}
      />
      {only ? null : (
        <Button
          kind="quiet"
          label="Take this topic away"
          accessibilityLabel={`Take topic ${String(index + 1)} away`}
          className="self-start"
          onPress={onRemove}
          testID="remove-topic"
        />
      )}
    </View>
  );
}
