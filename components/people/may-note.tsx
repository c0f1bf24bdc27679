import { useMay } from '@/components/api';
import { Label } from '@/components/ui';
import type { Act } from '@/shared/contracts/roles';

/** Says who may do this, where the signed-in member may not: an act that is missing without a word looks like a fault. */
export function MayNote({ act }: { act: Act }) {
  const { ok, why } = useMay(act);
  return ok ? null : <Label>{why}</Label>;
}
