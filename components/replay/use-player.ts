import { useCallback, useEffect, useRef, useState } from 'react';
import { deviceNowMs } from '@/components/api';

interface PlayerInput {
  fromUtcMs: number;
  toUtcMs: number;
  /** Where a link leads to. */
  startUtcMs: number | null;
  /** The whole night in so many seconds. */
  wholeS: number;
  /** Under reduced motion: the next instant to jump to, once a second; null at the end. */
  jump: ((utcMs: number) => number | null) | null;
}

const jumpEveryMs = 1000;

/** A hand on the time of a night: plays, waits, is moved. */
export function usePlayer({ fromUtcMs, toUtcMs, startUtcMs, wholeS, jump }: PlayerInput) {
  const within = useCallback((utcMs: number) => Math.min(toUtcMs, Math.max(fromUtcMs, utcMs)), [fromUtcMs, toUtcMs]);
  const [atUtcMs, setAt] = useState(within(startUtcMs ?? fromUtcMs));
  const [playing, setPlaying] = useState(false);
  const at = useRef(atUtcMs);
  const go = useCallback(
    (utcMs: number) => {
      at.current = within(utcMs);
      setAt(at.current);
    },
    [within],
  );
  useEffect(() => {
    if (!playing) return undefined;
    if (jump !== null) {
      const timer = setInterval(() => {
        const next = jump(at.current);
        go(next ?? toUtcMs);
        if (next === null) setPlaying(false);
      }, jumpEveryMs);
      return () => clearInterval(timer);
    }
    const perMs = (toUtcMs - fromUtcMs) / (1000 * wholeS);
    let lastMs = deviceNowMs();
    let frame = 0;
    const draw = () => {
      const nowMs = deviceNowMs();
      go(at.current + perMs * (nowMs - lastMs));
      lastMs = nowMs;
      if (at.current >= toUtcMs) setPlaying(false);
      else frame = requestAnimationFrame(draw);
    };
    frame = requestAnimationFrame(draw);
    return () => cancelAnimationFrame(frame);
  }, [playing, jump, fromUtcMs, toUtcMs, wholeS, go]);
  const toggle = () => {
    if (!playing && at.current >= toUtcMs) go(fromUtcMs);
    setPlaying(!playing);
  };
  return { atUtcMs, playing, toggle, go };
}
