import { useQueryClient } from '@tanstack/react-query';
import { labKey, useLab, useLabQuery } from '@/components/api';
import { getRig, listRigs, listRigRevisions } from '@/shared/contracts/rigs';

/** One rig, asked again every 2 s while it is seen. */
export const useRig = (rigId: string) => useLabQuery(getRig, { params: { rigId }, everyMs: 2000 });

/** Has everything that shows rigs read them again. */
export function useRefreshRigs(): () => void {
  const { labId } = useLab();
  const queries = useQueryClient();
  return () => {
    for (const route of [listRigs, getRig, listRigRevisions]) void queries.invalidateQueries({ queryKey: labKey(labId, route) });
  };
}
