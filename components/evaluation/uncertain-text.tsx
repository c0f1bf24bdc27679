import { Text, View } from 'react-native';
import { Body, Num } from '@/components/ui';
import { spokenUncertain, uncertainParts, unknownU, type Uncertain, type UncertainOptions } from '@/shared/lib/format-uncertain';

interface UncertainTextProps extends Uncertain {
  size?: 13 | 15 | 17 | 20 | 24 | 30 | 44;
  options?: UncertainOptions;
  testID?: string;
}

/** A result in GUM notation on one line: digits monospaced, the uncertainty dimmer, power and unit in the sans. */
export function UncertainText({ size = 15, options, testID, ...quantity }: UncertainTextProps) {
  const parts = uncertainParts(quantity, options);
  const small = size >= 30 ? 20 : size >= 20 ? 15 : 13;
  return (
    <Text role="img" aria-label={spokenUncertain(quantity, options)} testID={testID}>
      <Num size={size} light={size >= 30} className="whitespace-nowrap">
        {parts.value}
      </Num>
      <Num size={size} light={size >= 30} tone="dim" className="whitespace-nowrap">
        {parts.uncertainty}
      </Num>
      <Body size={small} tone="dim">
        {parts.factor}
        {parts.unit}
        {unknownU(quantity)}
      </Body>
    </Text>
  );
}

/** G as the largest thing of its screen: the digits alone on their line, power and unit right behind or below. */
export function LargeG({ value, u, unit, testID }: Uncertain & { testID?: string }) {
  const quantity = { value, u, unit };
  const parts = uncertainParts(quantity);
  return (
    <View role="img" aria-label={`G is ${spokenUncertain(quantity)}`} className="flex-row flex-wrap items-baseline gap-x-2" testID={testID}>
      <Text>
        <Num size={44} light>
          {parts.value}
        </Num>
        <Num size={44} light tone="dim">
          {parts.uncertainty}
        </Num>
      </Text>
      <Body size={17} tone="dim">
        {parts.factor.trim()}
        {parts.unit}
        {unknownU(quantity)}
      </Body>
    </View>
  );
}
