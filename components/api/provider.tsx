import { QueryClient, QueryClientProvider } from '@tanstack/react-query';
import { useEffect, useState, type ReactNode } from 'react';
import { getHealth } from '@/shared/contracts/service';
import { call } from './client';
import { useConnection } from './connection';
import { ApiUnreachable } from './problem';
import { SessionProvider } from './session';

const pingMs = 3000;

const newQueryClient = () =>
  new QueryClient({
    defaultOptions: {
      // The lab's server may be in the same room as a browser that believes itself offline.
      queries: { networkMode: 'always', staleTime: 5000, retry: (count, error) => error instanceof ApiUnreachable && count < 2 },
      mutations: { networkMode: 'always', retry: false },
    },
  });

/** Asks the server whether it is there: once for its time, then only while it cannot be reached. */
function useHeartbeat(queries: QueryClient) {
  const { online } = useConnection();
  useEffect(() => {
    const ask = () => call(getHealth).catch(() => undefined);
    void ask();
    if (online) return undefined;
    const timer = setInterval(ask, pingMs);
    return () => {
      clearInterval(timer);
      void queries.invalidateQueries();
    };
  }, [online, queries]);
}

/** Requests, their cache and the session, for everything below. */
export function ApiProvider({ children }: { children: ReactNode }) {
  const [queries] = useState(newQueryClient);
  useHeartbeat(queries);
  return (
    <QueryClientProvider client={queries}>
      <SessionProvider>{children}</SessionProvider>
    </QueryClientProvider>
  );
}
