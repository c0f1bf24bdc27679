import { useSyncExternalStore } from 'react';

const query = '(min-width: 1024px)';

function subscribe(changed: () => void) {
  const media = window.matchMedia?.(query);
  media?.addEventListener?.('change', changed);
  return () => media?.removeEventListener?.('change', changed);
}

/** Whether there is room for two panes: 1024 px or more. */
export const useWide = (): boolean =>
  useSyncExternalStore(
    subscribe,
    () => window.matchMedia?.(query).matches ?? false,
    () => false,
  );
