import { useMemo } from 'react';
import { useLabQuery } from '@/components/api';
import { listChannels } from '@/shared/contracts/data';
import { listRigRevisions, type RigView } from '@/shared/contracts/rigs';
import { readRoomHours } from '@/shared/contracts/schedules';
import type { Surroundings } from '@/shared/protocol/advise-surroundings';

/** What the lab knows around a rig that bears on a protocol: the hours of its room, its mass sets, its revisions, its channels. Empty while it loads. */
export function useSurroundings(rig: RigView | null): Surroundings {
  const about = { params: { rigId: rig?.id ?? '' }, enabled: rig !== null };
  const room = useLabQuery(readRoomHours, about).data?.data;
  const revisions = useLabQuery(listRigRevisions, about).data?.data.items;
  const channels = useLabQuery(listChannels, about).data?.data.items;
  const massSets = rig?.massSets;
  return useMemo(
    () => ({
      ...(room && { room }),
      ...(revisions && { revisions }),
      ...(massSets && { massSets }),
      ...(channels && { channels: channels.filter(({ source }) => source !== 'import') }),
    }),
    [room, revisions, massSets, channels],
  );
}
