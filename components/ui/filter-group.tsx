import { useState, type ReactNode } from 'react';
import { View } from 'react-native';
import { Button } from './button';
import { useWide } from './use-wide';

interface FilterGroupProps {
  /** What is filtered, for whoever hears the page. */
  label: string;
  /** Whether anything is left out now. */
  active: boolean;
  testID: string;
  children: ReactNode;
}

/** The fields of a filter: always there where there is room, behind a button on a phone. */
export function FilterGroup({ label, active, testID, children }: FilterGroupProps) {
  const wide = useWide();
  const [shown, setShown] = useState(false);
  if (!wide && !shown)
    return (
      <Button
        icon="filter"
        label={active ? 'Filter is on' : 'Filter'}
        onPress={() => setShown(true)}
        expanded={false}
        className="self-start"
        testID={testID}
      />
    );
  return (
    <View className="gap-3 wide:flex-row" role="group" aria-label={label}>
      {children}
    </View>
  );
}
