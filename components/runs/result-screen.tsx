import type { RunView } from '@/shared/contracts/runs';
import { Screen } from '@/components/ui';

export function ResultScreen({ view }: { view: RunView }) {
  return <Screen title={view.rigName} />;
}
