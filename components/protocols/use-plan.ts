import { useDeferredValue, useEffect, useMemo, useState } from 'react';
import { serverNowMs } from '@/components/api';
import type { Surroundings } from '@/shared/protocol/advise-surroundings';
import { nextOccurrenceUtcMs } from '@/shared/protocol/local-time';
import type { ProtocolDocument } from '@/shared/protocol/document';
import type { RigDocument } from '@/shared/rig/document';
import { makePlan, signalUOf, type Plan } from './plan';

const minuteMs = 60_000;
const thisMinute = () => Math.floor(serverNowMs() / minuteMs) * minuteMs;

/** The present minute by the server's clock, UTC ms. */
export function useMinute(): number {
  const [minute, setMinute] = useState(thisMinute);
  useEffect(() => {
    const timer = setInterval(() => setMinute(thisMinute()), 10_000);
    return () => clearInterval(timer);
  }, []);
  return minute;
}

interface PlanInput {
  document: ProtocolDocument;
  rig: RigDocument | null;
  surroundings: Surroundings;
  timeZone: string;
  /** Planned start as a time of day in the lab, `22:00`; empty for now. */
  startAt: string;
}

/** The plan of the draft, made anew at each change; typing stays ahead of it. */
export function usePlan({ document, rig, surroundings, timeZone, startAt }: PlanInput): Plan | null {
  const minute = useMinute();
  const deferred = useDeferredValue(document);
  const startUtcMs = useMemo(
    () => (startAt === '' ? minute : nextOccurrenceUtcMs({ localTime: startAt, timeZone, utcMs: minute })),
    [minute, startAt, timeZone],
  );
  const signalU = useMemo(() => (rig === null ? null : signalUOf(rig)), [rig]);
  return useMemo(
    () => (rig === null ? null : makePlan({ document: deferred, rig, surroundings, timeZone, startUtcMs, signalU })),
    [deferred, rig, surroundings, timeZone, startUtcMs, signalU],
  );
}
