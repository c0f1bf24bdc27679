import { useEffect, useRef, useState } from 'react';
import { deviceNowMs } from '@/components/api';

export const reducedMotion = (): boolean =>
  typeof window !== 'undefined' && (window.matchMedia?.('(prefers-reduced-motion: reduce)').matches ?? false);

/**
 * The angle between two reports, drawn on smoothly: reports come once a second, the table turns all the time. Under
 * reduced motion, and while nothing moves, the reported angle itself.
 */
export function useSmoothAngle(reportedDeg: number | null, reportMs = 1000): number | null {
  const [shownDeg, setShownDeg] = useState(reportedDeg);
  const from = useRef(reportedDeg);
  useEffect(() => {
    const startDeg = from.current;
    if (
      reportedDeg === null ||
      startDeg === null ||
      Math.abs(reportedDeg - startDeg) < 0.02 ||
      reducedMotion() ||
      typeof requestAnimationFrame !== 'function'
    ) {
      from.current = reportedDeg;
      setShownDeg(reportedDeg);
      return undefined;
    }
    const startMs = deviceNowMs();
    let frame = 0;
    const draw = () => {
      const share = Math.min(1, (deviceNowMs() - startMs) / reportMs);
      from.current = startDeg + (reportedDeg - startDeg) * share;
      setShownDeg(from.current);
      if (share < 1) frame = requestAnimationFrame(draw);
    };
    frame = requestAnimationFrame(draw);
    return () => cancelAnimationFrame(frame);
  }, [reportedDeg, reportMs]);
  return shownDeg;
}
