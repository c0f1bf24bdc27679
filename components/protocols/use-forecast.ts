import { useDeferredValue, useMemo } from 'react';
import { forecastNight, type NightForecast } from '@/shared/planning/night-forecast';
import { uIsPlanned } from '@/shared/planning/planned-method';
import { cadenceOf } from '@/shared/planning/strategies';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { RigDocument } from '@/shared/rig/document';
import type { Plan } from './plan';

/** What the planned night would give, worked out anew only where its cadence or its length changed; typing stays ahead of it. */
export function useForecast(plan: Plan | null, document: ProtocolDocument, rig: RigDocument | null): NightForecast | null {
  const night = useMemo(() => {
    const told = plan !== null && rig !== null && !plan.timeline.truncated && uIsPlanned(document);
    const cadence = told ? cadenceOf(plan.timeline, rig) : null;
    return plan === null || cadence === null ? null : JSON.stringify({ cadence, durationS: Math.round(plan.timeline.durationS) });
  }, [plan, document, rig]);
  const deferred = useDeferredValue(night);
  return useMemo(() => {
    if (deferred === null || rig === null) return null;
    const { cadence, durationS } = JSON.parse(deferred) as { cadence: NightForecast['cadence']; durationS: number };
    return forecastNight(rig, cadence, durationS);
  }, [deferred, rig]);
}
