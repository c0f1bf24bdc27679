import { type Href, useRouter } from 'expo-router';
import { View } from 'react-native';
import { Body, Button, Icon, Panel } from '@/components/ui';
import type { EvaluationResult } from '@/shared/evaluation/result';
import { placeOfWarning } from './warning-places';

interface WarningsPanelProps {
  warnings: EvaluationResult['warnings'];
  /** Seq of the first dwell that does not count; null where all do. */
  firstLeftOut: number | null;
  run: { id: string; rigId: string };
  onDwell: (seq: number) => void;
}

/** What a reader must know of how the result came about, each with the way to where it can be looked at. */
export function WarningsPanel({ warnings, firstLeftOut, run, onDwell }: WarningsPanelProps) {
  const router = useRouter();
  if (warnings.length === 0) return null;
  return (
    <Panel edge="lamp" className="gap-3" testID="warnings">
      {warnings.map(({ code, message }) => {
        const place = placeOfWarning(code, run);
        const go =
          place === null
            ? null
            : 'href' in place
              ? () => router.push(place.href as Href)
              : firstLeftOut === null
                ? null
                : () => onDwell(firstLeftOut);
        return (
          <View key={code + message} className="flex-row items-start gap-2">
            <Icon name="warning" size={18} tone="lamp" />
            <View className="min-w-0 flex-1 items-start gap-1">
              <Body>{message}</Body>
              {place === null || go === null ? null : <Button kind="quiet" label={place.label} onPress={go} testID={`warning-${code}`} />}
            </View>
          </View>
        );
      })}
    </Panel>
  );
}
