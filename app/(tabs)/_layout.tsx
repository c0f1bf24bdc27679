import { Slot } from 'expo-router';
import { Shell } from '@/components/shell/shell';

export default function TabsLayout() {
  return (
    <Shell>
      <Slot />
    </Shell>
  );
}
