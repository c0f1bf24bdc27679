import { StationsScreen } from '@/components/shell/lazy-screens';

export default function RigStations() {
  return <StationsScreen />;
}
