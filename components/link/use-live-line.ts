import { useEffect, useState } from 'react';
import { addressOf, deviceNowMs, hearServerTime, useLab } from '@/components/api';
import { reportReached } from '@/components/api/connection';
import { lineMessageSchema, liveLine, type LineMessage } from '@/shared/contracts/link';

const reopenMs = 1000;

export interface LiveLine {
  /** Null until the first message. */
  line: LineMessage | null;
  /** When the newest message came, by the device's clock, ms. */
  heardAtMs: number | null;
  /** The stream is broken and being opened again. */
  broken: boolean;
}

function readLine(text: string): LineMessage | null {
  try {
    const parsed = lineMessageSchema.safeParse(JSON.parse(text));
    return parsed.success ? parsed.data : null;
  } catch {
    return null;
  }
}

/** The line of a rig as it happens. The stream is opened again for as long as the page is there. */
export function useLiveLine(rigId: string): LiveLine {
  const { labId } = useLab();
  const [state, setState] = useState<LiveLine>({ line: null, heardAtMs: null, broken: false });
  useEffect(() => {
    let source: EventSource | null = null;
    let timer: ReturnType<typeof setTimeout> | undefined;
    const open = () => {
      const stream = new EventSource(addressOf(liveLine, { params: { labId, rigId } }));
      source = stream;
      stream.onopen = () => reportReached(true);
      stream.onerror = () => {
        setState((before) => ({ ...before, broken: true }));
        if (stream.readyState !== 2) return;
        stream.close();
        timer = setTimeout(open, reopenMs);
      };
      stream.addEventListener('line', (event) => {
        const line = readLine((event as MessageEvent<string>).data);
        if (line === null) return;
        hearServerTime(Date.parse(line.serverAt));
        setState({ line, heardAtMs: deviceNowMs(), broken: false });
      });
    };
    open();
    return () => {
      clearTimeout(timer);
      source?.close();
    };
  }, [labId, rigId]);
  return state;
}
