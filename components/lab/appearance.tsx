import { Pressable, View } from 'react-native';
import { themes, useTheme, type ThemeName } from '@/components/theme';
import { Body, Icon, Label, Section } from '@/components/ui';

const choices: readonly { name: ThemeName; label: string; use: string }[] = [
  { name: 'dark', label: 'Dark', use: 'for a dark room' },
  { name: 'light', label: 'Light', use: 'for the desk' },
  { name: 'red', label: 'Red lamp', use: 'for eyes that must stay adapted' },
];

/** The theme of this device. */
export function Appearance() {
  const { name, chosen, choose } = useTheme();
  return (
    <Section title="Appearance" remark={chosen ? 'Kept on this device.' : 'Dark until you choose; kept on this device.'}>
      <View role="radiogroup" aria-label="Theme" className="flex-row flex-wrap gap-3">
        {choices.map((choice) => (
          <Pressable
            key={choice.name}
            role="radio"
            aria-checked={name === choice.name}
            aria-label={`${choice.label}, ${choice.use}`}
            testID={`theme-${choice.name}`}
            onPress={() => choose(choice.name)}
            className={`min-w-[96px] flex-1 gap-2 rounded-panel border-2 bg-panel p-3 ${name === choice.name ? 'border-lamp' : 'border-panel hover:border-line'}`}
          >
            <Sample name={choice.name} />
            <View className="flex-row items-center gap-1">
              <Body strong>{choice.label}</Body>
              {name === choice.name ? <Icon name="tick" size={16} tone="lamp" /> : null}
            </View>
            <Label>{choice.use}</Label>
          </Pressable>
        ))}
      </View>
    </Section>
  );
}

/** A little of each theme in its own colours; under the red lamp all in red, as one white patch undoes half an hour in the dark. */
function Sample({ name }: { name: ThemeName }) {
  const present = useTheme().name;
  const colors = present === 'red' ? themes.red : themes[name];
  return (
    <View
      className="h-10 flex-row items-center gap-1.5 rounded-lg border px-2"
      style={{ backgroundColor: colors.ink, borderColor: colors.line }}
    >
      {[colors.near, colors.far, colors.lamp].map((color) => (
        <View key={color} className="h-3 flex-1 rounded-full" style={{ backgroundColor: color }} />
      ))}
    </View>
  );
}
