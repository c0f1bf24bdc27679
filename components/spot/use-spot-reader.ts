import { useEffect, useState } from 'react';
import { call, deviceNowMs, monotonicMs } from '@/components/api';
import { appendSamples } from '@/shared/contracts/devices';
import { getHealth } from '@/shared/contracts/service';
import { fitScale } from '@/shared/spot/scale';
import type { SpotSetting } from '@/shared/spot/setting';
import { browserCamera } from './camera';
import { watchDevice } from './device-watch';
import { devicePieces } from './kept-pieces';
import { KeptSetting } from './kept-setting';
import { SpotReader, type ReaderView, type SpotPlan } from './spot-reader';
import { SpotSender } from './spot-sender';

/** Where the camera's pictures are shown. */
class VideoPlace {
  element: HTMLVideoElement | null = null;
  readonly set = (element: HTMLVideoElement | null): void => {
    this.element = element;
  };
}

export interface SpotPage {
  place: VideoPlace;
  reader: SpotReader;
  view: ReaderView;
  setting: SpotSetting;
  change(part: Partial<SpotSetting>): void;
  begin(): void;
  end(): void;
}

/** How often the reader is stepped and the page drawn, ms; no answer to a batch within `answerMs` is none. */
const stepMs = 250;
const answerMs = 15_000;

const planOf = ({ region, of, light, marks, uMarkMm, picture, channel, token }: SpotSetting): SpotPlan => ({
  region,
  of,
  light,
  picture,
  scale: fitScale(marks, uMarkMm),
  target: { channel, token: token.trim() },
});

const sendBatch = async ({ token }: { token: string }, lines: string): Promise<void> => {
  const abort = new AbortController();
  const timer = setTimeout(() => abort.abort(), answerMs);
  try {
    await call(appendSamples, { raw: lines, deviceToken: token, signal: abort.signal });
  } finally {
    clearTimeout(timer);
  }
};

async function askTime() {
  const sentMs = monotonicMs();
  const { data } = await call(getHealth);
  return { sentMs, receivedMs: monotonicMs(), serverMs: Date.parse(data.serverAt) };
}

function makeReader(rigId: string) {
  const kept = new KeptSetting(rigId);
  const place = new VideoPlace();
  const device = watchDevice();
  // No page before this one can have given such an id, for none measures a thousand pieces in a millisecond.
  const sender = new SpotSender({ send: sendBatch, keep: devicePieces(rigId), firstId: deviceNowMs() * 1000, nowMs: monotonicMs });
  const reader = new SpotReader(
    {
      camera: browserCamera(() => place.element),
      device,
      sender,
      askTime,
      nowMs: monotonicMs,
      deviceUtcMs: deviceNowMs,
    },
    planOf(kept.now),
  );
  const end = () => {
    reader.closeCamera();
    device.end();
    void sender.keepUp();
  };
  return { kept, place, reader, sender, end };
}

/** The reader of a rig with its setting, which the device remembers. It lives as long as the page. */
export function useSpotReader(rigId: string): SpotPage {
  const [{ kept, place, reader, sender, end }] = useState(() => makeReader(rigId));
  const [setting, setSetting] = useState(kept.now);
  const [view, setView] = useState(() => reader.view());
  useEffect(() => {
    if (kept.now.reading) reader.resume({ id: kept.now.cameraId, name: kept.now.cameraName });
    const timer = setInterval(() => {
      void reader.step();
      setView(reader.view());
    }, stepMs);
    const keep = () => void sender.keepUp();
    window.addEventListener('pagehide', keep);
    return () => {
      clearInterval(timer);
      window.removeEventListener('pagehide', keep);
      end();
    };
  }, [kept, reader, sender, end]);
  useStaysOpen(view.sending || (view.sender.unkept !== null && view.sender.buffer.held > 0));
  const change = (part: Partial<SpotSetting>) => {
    const next = kept.change(part);
    setSetting(next);
    reader.use(planOf(next));
  };
  const begin = () => {
    reader.begin();
    change({ reading: true });
  };
  const stop = () => {
    reader.end();
    change({ reading: false });
  };
  return { place, reader, view, setting, change, begin, end: stop };
}

/** The browser asks before it closes the page. */
function useStaysOpen(wanted: boolean): void {
  useEffect(() => {
    if (!wanted) return undefined;
    const ask = (event: BeforeUnloadEvent) => event.preventDefault();
    window.addEventListener('beforeunload', ask);
    return () => window.removeEventListener('beforeunload', ask);
  }, [wanted]);
}
