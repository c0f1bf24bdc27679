import { useEffect, useState } from 'react';
import { browserCamera } from './camera';

/** The cameras of this device, looked for anew whenever one comes or goes, or `state` changes: names are told only once one was allowed. */
export function useDeviceCameras(state: string): { id: string; name: string }[] {
  const [cameras, setCameras] = useState<{ id: string; name: string }[]>([]);
  useEffect(() => {
    let live = true;
    const look = () =>
      void browserCamera(() => null)
        .list()
        .then((found) => (live ? setCameras(found) : undefined));
    look();
    const media = (navigator as { mediaDevices?: MediaDevices }).mediaDevices;
    media?.addEventListener('devicechange', look);
    return () => {
      live = false;
      media?.removeEventListener('devicechange', look);
    };
  }, [state]);
  return cameras;
}
