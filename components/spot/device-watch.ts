import type { WatchedDevice } from '@/shared/spot/warnings';

/** Keeps the device awake, and tells what may end a night's reading: battery, sleep, a page that is not seen. */
export interface DeviceWatch {
  now(): WatchedDevice;
  /** From now on the device is to stay awake. */
  keepAwake(): void;
  letSleep(): void;
  end(): void;
}

interface Battery extends EventTarget {
  level: number;
  charging: boolean;
}
type Browser = Navigator & { getBattery?: () => Promise<Battery>; wakeLock?: WakeLock };

export function watchDevice(): DeviceWatch {
  const browser = navigator as Browser;
  let battery: Battery | null = null;
  let lock: WakeLockSentinel | null = null;
  let wanted = false;
  const hidden = () => document.visibilityState === 'hidden';
  const ask = () => {
    if (!wanted || hidden() || (lock !== null && !lock.released)) return;
    browser.wakeLock?.request('screen').then(
      (granted) => {
        if (wanted) lock = granted;
        else void granted.release();
      },
      () => undefined,
    );
  };
  const letSleep = () => {
    wanted = false;
    void lock?.release();
    lock = null;
  };
  browser.getBattery?.().then(
    (found) => {
      battery = found;
    },
    () => undefined,
  );
  // A page that goes out of sight loses the lock.
  document.addEventListener('visibilitychange', ask);
  return {
    now: () => ({
      awake: browser.wakeLock === undefined ? null : !wanted || (lock !== null && !lock.released),
      battery: battery === null ? null : { level: battery.level, charging: battery.charging },
      hidden: hidden(),
    }),
    keepAwake: () => {
      wanted = true;
      ask();
    },
    letSleep,
    end: () => {
      letSleep();
      document.removeEventListener('visibilitychange', ask);
    },
  };
}
