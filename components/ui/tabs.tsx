import { Pressable, View } from 'react-native';
import { Body } from './text';

interface TabsProps<V extends string> {
  label: string;
  value: V;
  options: readonly { value: V; label: string }[];
  onChange: (value: V) => void;
  testID?: string;
}

/** A few views of one thing, or a choice of few: arrow keys move, the chosen one is underlined as well as coloured. */
export function Tabs<V extends string>({ label, value, options, onChange, testID }: TabsProps<V>) {
  const move = (by: number) => {
    const at = options.findIndex((option) => option.value === value);
    const next = options[(at + by + options.length) % options.length];
    if (next !== undefined) onChange(next.value);
  };
  const keys = {
    onKeyDown: (event: { key: string }) => (event.key === 'ArrowRight' ? move(1) : event.key === 'ArrowLeft' ? move(-1) : undefined),
  };
  return (
    <View role="radiogroup" aria-label={label} testID={testID} className="flex-row flex-wrap gap-1 rounded-action bg-panel p-1" {...keys}>
      {options.map((option) => {
        const chosen = option.value === value;
        return (
          <Pressable
            key={option.value}
            role="radio"
            aria-checked={chosen}
            aria-label={option.label}
            tabIndex={chosen ? 0 : -1}
            onPress={() => onChange(option.value)}
            className={`min-h-target flex-1 items-center justify-center rounded-xl px-3 ${chosen ? 'bg-panel2' : ''}`}
          >
            <View className={`border-b-2 ${chosen ? 'border-lamp' : 'border-panel'}`}>
              <Body strong={chosen} tone={chosen ? 'text' : 'dim'} className="text-center">
                {option.label}
              </Body>
            </View>
          </Pressable>
        );
      })}
    </View>
  );
}
