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

function makeSender() {
  const place = new VideoPlace();
  const device = watchDevice();
  const camera = browserCamera(() => place.element);
  const sender = new PictureSender({ camera, device, shot: () => shotOf(place.element), send, nowMs: monotonicMs });
  const end = () => {
    sender.closeCamera();
    device.end();
  };
  return { place, sender, end };
}

/** The sender of this page, which lives as long as the page. */
export function usePictureSender(token: string): SenderPage {
  const [{ place, sender, end }] = useState(makeSender);
  const [view, setView] = useState(() => sender.view());
  useEffect(() => {
    const timer = setInterval(() => {
      void sender.step(token);
      setView(sender.view());
    }, stepMs);
    return () => clearInterval(timer);
  }, [sender, token]);
  useEffect(() => end, [end]);
  return { place, sender, view };
}

const keyOf = (rigId: string) => `evenfall.camera.${rigId}`;

function read(rigId: string): string {
  try {
    return window.localStorage.getItem(keyOf(rigId)) ?? '';
  } catch {
    return '';
  }
}

/** The token of the camera that this device is, kept on the device; a browser that refuses storage keeps it for this page only. */
export function useKeptToken(rigId: string): [token: string, keep: (token: string) => void] {
  const [token, setToken] = useState(() => read(rigId));
  const keep = (next: string) => {
    setToken(next);
    try {
      window.localStorage.setItem(keyOf(rigId), next.trim());
    } catch {
      return;
    }
  };
  return [token, keep];
}
