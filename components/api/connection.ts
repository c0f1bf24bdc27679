import { useSyncExternalStore } from 'react';
import { deviceNowMs } from './device-clock';

/** Whether the server answers. Learned from real requests: the browser's own flag knows only of the network card. */
export interface Connection {
  online: boolean;
  /** Since when it is as it is, device ms. */
  sinceMs: number;
}

let connection: Connection = { online: true, sinceMs: deviceNowMs() };
const listeners = new Set<() => void>();

/** Reports the fate of a request. */
export function reportReached(online: boolean): void {
  if (online === connection.online) return;
  connection = { online, sinceMs: deviceNowMs() };
  for (const listener of listeners) listener();
}

export const currentConnection = (): Connection => connection;

function subscribe(listener: () => void) {
  listeners.add(listener);
  return () => listeners.delete(listener);
}

/** The connection as a page sees it. */
export const useConnection = (): Connection => useSyncExternalStore(subscribe, currentConnection, currentConnection);
