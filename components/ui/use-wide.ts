import { useCallback, useSyncExternalStore } from 'react';

function useMedia(query: string): boolean {
  const subscribe = useCallback(
    (changed: () => void) => {
      const media = window.matchMedia?.(query);
      media?.addEventListener?.('change', changed);
      return () => media?.removeEventListener?.('change', changed);
    },
    [query],
  );
  return useSyncExternalStore(
    subscribe,
    () => window.matchMedia?.(query).matches ?? false,
    () => false,
  );
}

/** Whether there is room for two panes: 1024 px or more. */
export const useWide = (): boolean => useMedia('(min-width: 1024px)');

/** Whether the page is so low that what stays at the bottom would leave no room: a small phone on its side, or 400 % zoom. */
export const useLow = (): boolean => useMedia('(max-height: 599px)');
