import type { Response } from 'express';

/** More than this unsent means that the reader cannot keep up; it is let go and comes back with Last-Event-ID. */
const mostUnsentBytes = 1_048_576;

/** A message as it goes out. `id` is what the browser sends back as Last-Event-ID; null leaves the last one standing. */
export function encodeEvent(event: string, data: unknown, id: number | null): string {
  const idLine = id === null ? '' : `id: ${String(id)}\n`;
  return `${idLine}event: ${event}\ndata: ${JSON.stringify(data)}\n\n`;
}

/** One open stream of server-sent events (HTML Living Standard, 9.2). */
export class EventStream {
  constructor(private readonly res: Response) {
    // The end of the stream is the end of the line: no message needs a frame of its own around it.
    res.removeHeader('Transfer-Encoding');
    res.status(200).set({ 'Content-Type': 'text/event-stream; charset=utf-8', 'Cache-Control': 'no-store', 'X-Accel-Buffering': 'no' });
    res.flushHeaders();
  }

  /** How long a browser waits before it comes back, ms. */
  retry(ms: number): void {
    this.write(`retry: ${String(ms)}\n\n`);
  }

  /** A message, or several, as `encodeEvent` makes them. */
  send(encoded: string | Uint8Array): void {
    this.write(encoded);
  }

  /** Bytes that mean nothing, so that proxies keep the line open. */
  comment(text: string): void {
    this.write(`: ${text}\n\n`);
  }

  end(): void {
    this.res.end();
  }

  onClosed(listener: () => void): void {
    this.res.once('close', listener);
  }

  private write(text: string | Uint8Array): void {
    if (this.res.writableEnded || this.res.destroyed) return;
    this.res.write(text);
    if (this.res.writableLength > mostUnsentBytes) this.res.destroy();
  }
}
