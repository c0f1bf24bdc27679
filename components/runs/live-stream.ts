import { reportReached } from '@/components/api/connection';
import { deviceNowMs, hearServerTime } from '@/components/api/device-clock';
import { liveMessageSchemas, type LiveMessages } from '@/shared/contracts/runs';
import type { LiveMessage } from './live-reducer';

const reopenMs = 2000;
const types = Object.keys(liveMessageSchemas) as (keyof LiveMessages)[];

/** A message as it came over the line, or null when it is not one of ours (a newer server may send more kinds). */
export function readMessage(type: keyof LiveMessages, text: string, receivedAtMs: number): LiveMessage | null {
  try {
    const parsed = liveMessageSchemas[type].safeParse(JSON.parse(text));
    return parsed.success ? ({ type, data: parsed.data, receivedAtMs } as LiveMessage) : null;
  } catch {
    return null;
  }
}

interface Handlers {
  onMessage: (message: LiveMessage) => void;
  onOpen: () => void;
  onBroken: () => void;
}

/** Opens the stream and keeps it open. The browser itself reconnects with Last-Event-ID; one that it gave up is opened anew. */
export function openLiveStream(address: string, { onMessage, onOpen, onBroken }: Handlers): () => void {
  let source: EventSource | null = null;
  let timer: ReturnType<typeof setTimeout> | undefined;
  const open = () => {
    const stream = new EventSource(address);
    source = stream;
    stream.onopen = () => {
      reportReached(true);
      onOpen();
    };
    stream.onerror = () => {
      onBroken();
      if (stream.readyState !== 2) return;
      stream.close();
      timer = setTimeout(open, reopenMs);
    };
    for (const type of types) {
      stream.addEventListener(type, (event) => {
        const message = readMessage(type, (event as MessageEvent<string>).data, deviceNowMs());
        if (message?.type === 'beat') hearServerTime(Date.parse(message.data.serverAt));
        if (message !== null) onMessage(message);
      });
    }
  };
  open();
  return () => {
    clearTimeout(timer);
    source?.close();
  };
}
