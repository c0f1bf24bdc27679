import { useQueryClient } from '@tanstack/react-query';
import { labKey, useLab } from '@/components/api';
import { listSchedules, readCalendar, readFeedState, readRoomHours } from '@/shared/contracts/schedules';

/** Has everything that shows schedules read them again. */
export function useRefreshCalendar(): () => void {
  const { labId } = useLab();
  const queries = useQueryClient();
  return () => {
    for (const route of [listSchedules, readCalendar, readFeedState, readRoomHours])
      void queries.invalidateQueries({ queryKey: labKey(labId, route) });
  };
}
