import { useState } from 'react';
import { useLabQuery } from '@/components/api';
import { getRig, listRigs, type RigSummary, type RigView } from '@/shared/contracts/rigs';

const key = 'evenfall.planning-rig';

function remembered(): string | null {
  try {
    return window.localStorage.getItem(key);
  } catch {
    return null;
  }
}

function remember(rigId: string): void {
  try {
    window.localStorage.setItem(key, rigId);
  } catch {
    return;
  }
}

export interface PlanningRig {
  rigs: readonly RigSummary[];
  rig: RigView | null;
  /** No rig in the lab: nothing can be predicted. */
  none: boolean;
  choose: (rigId: string) => void;
}

/** The rig for which protocols are planned on this device: the one chosen last, else the first of the lab. */
export function usePlanningRig(): PlanningRig {
  const [chosen, setChosen] = useState(remembered);
  const list = useLabQuery(listRigs);
  const rigs = list.data?.data.items ?? [];
  const rigId = rigs.find(({ id }) => id === chosen)?.id ?? rigs[0]?.id;
  const rig = useLabQuery(getRig, { params: { rigId: rigId ?? '' }, enabled: rigId !== undefined });
  return {
    rigs,
    rig: rig.data?.data ?? null,
    none: list.isSuccess && rigs.length === 0,
    choose: (id) => {
      remember(id);
      setChosen(id);
    },
  };
}
