import { act } from '@testing-library/react';

/** A stream of server-sent events in the page's own memory: what a test says arrives as if the server had sent it. */
export interface FakeStream {
  say: (event: string, data: unknown) => void;
  /** The stream breaks; the browser tries to open it again by itself. */
  breaks: () => void;
  open: () => number;
}

/** Puts a stream in the place of the browser's for one test. */
export function startFakeStream(): FakeStream {
  const streams = new Set<FakeSource>();
  class FakeSource extends EventTarget {
    readyState = 1;
    onopen: (() => void) | null = null;
    onerror: (() => void) | null = null;
    constructor() {
      super();
      streams.add(this);
    }
    close(): void {
      streams.delete(this);
    }
  }
  globalThis.EventSource = FakeSource as unknown as typeof EventSource;
  return {
    say: (event, data) =>
      act(() => {
        for (const stream of streams) stream.dispatchEvent(new MessageEvent(event, { data: JSON.stringify(data) }));
      }),
    breaks: () =>
      act(() => {
        for (const stream of streams) stream.onerror?.();
      }),
    open: () => streams.size,
  };
}
