import { useEffect, useState } from 'react';
import { deviceNowMs } from '@/components/api';

/** The device's time, renewed every `everyMs` while `on`. */
export function useNow(everyMs: number, on = true): number {
  const [now, setNow] = useState(deviceNowMs);
  useEffect(() => {
    if (!on) return undefined;
    const timer = setInterval(() => setNow(deviceNowMs()), everyMs);
    return () => clearInterval(timer);
  }, [everyMs, on]);
  return now;
}

/** A text that changes at most once in `leastMs`, always arriving at its newest value: for a live region that must not chatter. */
export function useCalm(text: string, leastMs = 5000): string {
  const [shown, setShown] = useState({ text, atMs: -Infinity });
  useEffect(() => {
    if (text === shown.text) return undefined;
    const waitMs = Math.max(0, shown.atMs + leastMs - deviceNowMs());
    const timer = setTimeout(() => setShown({ text, atMs: deviceNowMs() }), waitMs);
    return () => clearTimeout(timer);
  }, [text, shown, leastMs]);
  return shown.text;
}
