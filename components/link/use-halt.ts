import { useLabCall } from '@/components/api';
import type { SafePost } from '@/components/runs/safe-acts';
import { useSafeActs } from '@/components/runs/use-intervention';
import { holdRig, stopRig } from '@/shared/contracts/link';

/** Hold and stop of whatever moves on a rig: one tap, sent until answered, acted on at most once. */
export function useHalt(rigId: string) {
  const hold = useLabCall(holdRig);
  const stop = useLabCall(stopRig);
  const post: SafePost = (act, input) => (act === 'stop' ? stop : hold)({ params: { rigId }, ...input });
  return useSafeActs(post);
}
