import { View } from 'react-native';
import { Body, Button, Field, Label, Select } from '@/components/ui';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { useEditor } from './editor-context';
import { NumberField, positive } from './forms/number-field';

type GoodWhen = NonNullable<ProtocolDocument['goodWhen']>;
type ChannelRule = NonNullable<GoodWhen['channels']>[number];
type Limit = 'below' | 'above' | 'slopeBelow_per_h';

const limits: readonly { value: Limit; label: string }[] = [
  { value: 'slopeBelow_per_h', label: 'slope an hour below' },
  { value: 'below', label: 'below' },
  { value: 'above', label: 'above' },
];
const limitOf = (rule: ChannelRule): Limit =>
  rule.slopeBelow_per_h !== undefined ? 'slopeBelow_per_h' : rule.above !== undefined ? 'above' : 'below';

/** Without empty parts: a protocol that asks for nothing says nothing. */
function cleaned({ residual_urad, channels = [] }: GoodWhen): GoodWhen | undefined {
  if (residual_urad === undefined && channels.length === 0) return undefined;
  return { ...(residual_urad === undefined ? {} : { residual_urad }), ...(channels.length === 0 ? {} : { channels }) };
}

/** What makes a dwell good: fixed beforehand, never by its own value. */
export function GoodWhenFields() {
  const { document, mayWrite, changeDocument } = useEditor();
  const goodWhen = document.goodWhen ?? {};
  const channels = goodWhen.channels ?? [];
  const change = (next: GoodWhen) => changeDocument({ goodWhen: cleaned(next) });
  const put = (index: number, rule: ChannelRule | null) =>
    change({ ...goodWhen, channels: channels.flatMap((each, at) => (at !== index ? [each] : rule === null ? [] : [rule])) });
  return (
    <View className="gap-4 border-t border-line pt-5" testID="good-when">
      <Body strong>A dwell is good when</Body>
      <Label>
        Always: deflection not silent for over 60 s, and not off its fit by over 100 µrad for over 30 s. And, if you ask for it:
      </Label>
      <NumberField
        label="Noise about the fit at most"
        unit="µrad"
        optional
        placeholder="not asked for"
        value={goodWhen.residual_urad}
        refuse={positive}
        onChange={(value) => change({ ...goodWhen, residual_urad: value })}
        disabled={!mayWrite}
        testID="good-residual"
      />
      {channels.map((rule, index) => (
        // Rules have no names of their own; they are edited in place.
        <ChannelFields key={index} rule={rule} disabled={!mayWrite} onChange={(next) => put(index, next)} />
      ))}
      {mayWrite ? (
        <Button
          kind="quiet"
          icon="plus"
          label="A channel of the room"
          className="self-start"
          onPress={() => change({ ...goodWhen, channels: [...channels, { channel: 'box temperature', slopeBelow_per_h: 0.3 }] })}
          testID="good-add-channel"
        />
      ) : null}
    </View>
  );
}

function ChannelFields({
  rule,
  onChange,
  disabled,
}: {
  rule: ChannelRule;
  onChange: (rule: ChannelRule | null) => void;
  disabled: boolean;
}) {
  const limit = limitOf(rule);
  const value = rule[limit];
  return (
    <View className="gap-3 rounded-panel border border-line p-3">
      <Field
        label="Channel"
        value={rule.channel}
        onChange={(channel) => (channel === '' ? undefined : onChange({ ...rule, channel }))}
        disabled={disabled}
      />
      <Select
        label="Has to be"
        value={limit}
        options={limits}
        onChange={(next) => onChange({ channel: rule.channel, [next]: value ?? 1 })}
        disabled={disabled}
      />
      <NumberField
        label="Limit, in the unit of the channel"
        value={value}
        onChange={(next) => (next === undefined ? undefined : onChange({ channel: rule.channel, [limit]: next }))}
        disabled={disabled}
        {...(limit === 'slopeBelow_per_h' ? { refuse: positive } : {})}
      />
      {disabled ? null : <Button kind="quiet" icon="close" label="Leave it out" className="self-start" onPress={() => onChange(null)} />}
    </View>
  );
}
