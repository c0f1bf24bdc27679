import { Slot } from 'expo-router';
import { Shell } from '@/components/shell/shell';

export { PageFailed as ErrorBoundary } from '@/components/shell/page-failed';

export default function TabsLayout() {
  return (
    <Shell>
      <Slot />
    </Shell>
  );
}
