import { useEffect, useState } from 'react';
import { call, monotonicMs } from '@/components/api';
import { browserCamera } from '@/components/spot/camera';
import { watchDevice } from '@/components/spot/device-watch';
import { sendCameraPicture } from '@/shared/contracts/cameras';
import { PictureSender, type SenderView } from './picture-sender';

/** How often the sender is stepped and the page drawn, ms; no answer to a picture within `answerMs` is none. */
const stepMs = 250;
const answerMs = 15_000;
/** Wider pictures are made smaller, px; and how much is kept of them. */
const mostPx = 960;
const quality = 0.8;

/** Where the camera's pictures are shown. */
class VideoPlace {
  element: HTMLVideoElement | null = null;
  readonly set = (element: HTMLVideoElement | null): void => {
    this.element = element;
  };
}

export interface SenderPage {
  place: VideoPlace;
  sender: PictureSender;
  view: SenderView;
  begin(): void;
  end(): void;
}

async function shotOf(video: HTMLVideoElement | null): Promise<Blob | null> {
  if (video === null || video.videoWidth === 0) return null;
  const canvas = document.createElement('canvas');
  const scale = Math.min(1, mostPx / video.videoWidth);
  canvas.width = Math.round(scale * video.videoWidth);
  canvas.height = Math.round(scale * video.videoHeight);
  canvas.getContext('2d')?.drawImage(video, 0, 0, canvas.width, canvas.height);
  return new Promise((resolve) => canvas.toBlob(resolve, 'image/jpeg', quality));
}

async function send(deviceToken: string, raw: Blob, ageS: number): Promise<void> {
  const abort = new AbortController();
  const timer = setTimeout(() => abort.abort(), answerMs);
  try {
    await call(sendCameraPicture, { raw, deviceToken, query: { ageS: Math.max(0, Math.round(1000 * ageS) / 1000) }, signal: abort.signal });
  } finally {
    clearTimeout(timer);
  }
}

function makeSender(goesOn: boolean) {
  const place = new VideoPlace();
  const device = watchDevice();
  const camera = browserCamera(() => place.element);
  const sender = new PictureSender({ camera, device, shot: () => shotOf(place.element), send, nowMs: monotonicMs });
  if (goesOn) sender.resume();
  const end = () => {
    sender.closeCamera();
    device.end();
  };
  return { place, sender, end };
}

/** The sender of this page, which lives as long as the page; one that was sending when it was loaded anew goes on. */
export function usePictureSender(rigId: string, token: string): SenderPage {
  const [sends, keepSends] = useKept(`evenfall.camera.${rigId}.sends`);
  const [{ place, sender, end }] = useState(() => makeSender(sends === 'yes' && token !== ''));
  const [view, setView] = useState(() => sender.view());
  useEffect(() => {
    const timer = setInterval(() => {
      void sender.step(token);
      setView(sender.view());
    }, stepMs);
    return () => clearInterval(timer);
  }, [sender, token]);
  useEffect(() => end, [end]);
  const begin = () => {
    keepSends('yes');
    sender.begin();
  };
  const stop = () => {
    keepSends('');
    sender.end();
  };
  return { place, sender, view, begin, end: stop };
}

function read(key: string): string {
  try {
    return window.localStorage.getItem(key) ?? '';
  } catch {
    return '';
  }
}

/** A text that the device keeps; a browser that refuses storage keeps it for this page only. */
function useKept(key: string): [text: string, keep: (text: string) => void] {
  const [text, setText] = useState(() => read(key));
  const keep = (next: string) => {
    setText(next);
    try {
      window.localStorage.setItem(key, next.trim());
    } catch {
      return;
    }
  };
  return [text, keep];
}

/** The token of the camera that this device is. */
export const useKeptToken = (rigId: string) => useKept(`evenfall.camera.${rigId}`);
