import { Pressable, View } from 'react-native';
import { Icon } from './icon';
import { Body, Label } from './text';

interface SwitchProps {
  label: string;
  value: boolean;
  onChange: (value: boolean) => void;
  hint?: string;
  disabled?: boolean;
  testID?: string;
}

/** On or off, with its words; the whole row is the target. On shows a tick, not only a colour. */
export function Switch({ label, value, onChange, hint, disabled = false, testID }: SwitchProps) {
  return (
    <Pressable
      role="switch"
      aria-checked={value}
      aria-label={label}
      disabled={disabled}
      testID={testID}
      onPress={() => onChange(!value)}
      className={`min-h-target flex-row items-center gap-4 py-2 ${disabled ? 'opacity-50' : ''}`}
    >
      <View
        className={`h-8 w-14 justify-center rounded-full border px-1 ${value ? 'items-end border-lamp bg-lamp' : 'items-start border-faint bg-ink'}`}
      >
        <View className={`h-6 w-6 items-center justify-center rounded-full ${value ? 'bg-on-lamp' : 'bg-faint'}`}>
          {value ? <Icon name="tick" size={16} tone="lamp" /> : null}
        </View>
      </View>
      <View className="flex-1">
        <Body>{label}</Body>
        {hint === undefined ? null : <Label>{hint}</Label>}
      </View>
    </Pressable>
  );
}

interface CheckProps {
  label: string;
  value: boolean;
  onChange: (value: boolean) => void;
  testID?: string;
}

/** A statement to be ticked, for example a caution that was read. */
export function Check({ label, value, onChange, testID }: CheckProps) {
  return (
    <Pressable
      role="checkbox"
      aria-checked={value}
      aria-label={label}
      testID={testID}
      onPress={() => onChange(!value)}
      className="min-h-target flex-row items-center gap-3 py-2"
    >
      <View className={`h-7 w-7 items-center justify-center rounded-lg border-2 ${value ? 'border-lamp bg-lamp' : 'border-faint bg-ink'}`}>
        {value ? <Icon name="tick" size={20} tone="onLamp" /> : null}
      </View>
      <Body className="flex-1">{label}</Body>
    </Pressable>
  );
}
