import { useState } from 'react';
import { View, type GestureResponderEvent } from 'react-native';
import { Icon } from '@/components/ui';
import { formatClock } from '@/shared/lib/format-time';

interface TimeSliderProps {
  fromUtcMs: number;
  toUtcMs: number;
  atUtcMs: number;
  timeZone: string;
  /** Instants that are marked over it: alarms. */
  marks: readonly number[];
  onChange: (utcMs: number) => void;
  /** Page up and page down: to the next or the previous step. */
  onStep: (by: 1 | -1) => void;
}

/** So many presses of an arrow key take one through the whole night. */
const keyPresses = 200;

/** The time of a night under the thumb, 48 px high; by keys as well. */
export function TimeSlider({ fromUtcMs, toUtcMs, atUtcMs, timeZone, marks, onChange, onStep }: TimeSliderProps) {
  const [width, setWidth] = useState(1);
  const spanMs = Math.max(1, toUtcMs - fromUtcMs);
  const share = (atUtcMs - fromUtcMs) / spanMs;
  const move = (event: GestureResponderEvent) =>
    onChange(fromUtcMs + spanMs * Math.min(1, Math.max(0, event.nativeEvent.locationX / width)));
  const byKey: Record<string, () => void> = {
    ArrowRight: () => onChange(atUtcMs + spanMs / keyPresses),
    ArrowUp: () => onChange(atUtcMs + spanMs / keyPresses),
    ArrowLeft: () => onChange(atUtcMs - spanMs / keyPresses),
    ArrowDown: () => onChange(atUtcMs - spanMs / keyPresses),
    PageUp: () => onStep(1),
    PageDown: () => onStep(-1),
    Home: () => onChange(fromUtcMs),
    End: () => onChange(toUtcMs),
  };
  const keys = {
    onKeyDown: (event: { key: string; preventDefault: () => void }) => {
      const act = byKey[event.key];
      if (act === undefined) return;
      event.preventDefault();
      act();
    },
  };
  return (
    <View
      role="slider"
      aria-label="Time of the night"
      aria-valuemin={0}
      aria-valuemax={1000}
      aria-valuenow={Math.round(1000 * share)}
      aria-valuetext={formatClock(atUtcMs, { timeZone, precision: 'seconds' })}
      tabIndex={0}
      testID="time-slider"
      className="min-h-target justify-center"
      style={{ touchAction: 'none', cursor: 'pointer' } as object}
      onLayout={({ nativeEvent }) => setWidth(Math.max(1, nativeEvent.layout.width))}
      onStartShouldSetResponder={() => true}
      onMoveShouldSetResponder={() => true}
      onResponderTerminationRequest={() => false}
      onResponderGrant={move}
      onResponderMove={move}
      {...keys}
    >
      <View pointerEvents="none" className="h-2 rounded-full bg-panel2">
        <View className="h-2 rounded-full bg-lamp" style={{ width: `${100 * share}%` }} />
      </View>
      {marks.map((utcMs) => (
        <View
          key={utcMs}
          pointerEvents="none"
          className="absolute top-0"
          style={{ left: `${(100 * (utcMs - fromUtcMs)) / spanMs}%`, marginLeft: -7 }}
        >
          <Icon name="warning" size={14} tone="danger" />
        </View>
      ))}
      <View pointerEvents="none" className="absolute h-6 w-6 rounded-full bg-lamp" style={{ left: `${100 * share}%`, marginLeft: -12 }} />
    </View>
  );
}
