import { useEffect, useRef, useState } from 'react';

/** A review counts for 30 s on the server; a page that stays open asks for a fresh one in time. */
const renewMs = 20_000;
const retryMs = 3_000;

interface Held<T> {
  of: string;
  review: T;
}

/**
 * Keeps a review that counts while `on`: asked for when what is reviewed changes, and again before it grows old.
 * @param of names what is reviewed; another name is another review
 */
export function useReview<T>(
  of: string,
  ask: () => Promise<T>,
  on: boolean,
): { review: T | null; /** Why the last one could not be had; null where it could. */ problem: unknown; renew: () => void } {
  const [held, setHeld] = useState<Held<T> | null>(null);
  const [problem, setProblem] = useState<unknown>(null);
  const [turn, setTurn] = useState(0);
  // Another function at each drawing; what it asks for is named by `of`.
  const newest = useRef(ask);
  useEffect(() => {
    newest.current = ask;
  });
  useEffect(() => {
    if (!on) return undefined;
    let over = false;
    let timer: ReturnType<typeof setTimeout> | undefined;
    const again = (ms: number) => {
      timer = setTimeout(() => setTurn((before) => before + 1), ms);
    };
    newest.current().then(
      (review) => {
        if (over) return;
        setHeld({ of, review });
        setProblem(null);
        again(renewMs);
      },
      (error: unknown) => {
        if (over) return;
        setHeld(null);
        setProblem(error);
        again(retryMs);
      },
    );
    return () => {
      over = true;
      clearTimeout(timer);
    };
  }, [of, on, turn]);
  return {
    review: on && held?.of === of ? held.review : null,
    problem,
    renew: () => {
      setHeld(null);
      setTurn((before) => before + 1);
    },
  };
}
