import { freshSetting, spotSettingSchema, type SpotSetting } from '@/shared/spot/setting';

/** The setting of a rig's reader on this device, so that a page that was loaded anew goes on where it was. */

const keyOf = (rigId: string) => `evenfall.spot.${rigId}`;

/** A fresh one where there is none, it is of another version, or the browser refuses storage. */
export function readSetting(rigId: string): SpotSetting {
  try {
    const text = window.localStorage.getItem(keyOf(rigId));
    const parsed = text === null ? null : spotSettingSchema.safeParse(JSON.parse(text));
    return parsed?.success ? parsed.data : freshSetting;
  } catch {
    return freshSetting;
  }
}

export function keepSetting(rigId: string, setting: SpotSetting): void {
  try {
    window.localStorage.setItem(keyOf(rigId), JSON.stringify(setting));
  } catch {
    return;
  }
}
