import { SpotScreen } from '@/components/shell/lazy-screens';

export default function LightSpot() {
  return <SpotScreen />;
}
