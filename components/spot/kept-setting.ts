import { freshSetting, spotSettingSchema, type SpotSetting } from '@/shared/spot/setting';

/** The setting of a rig's reader on this device, so that a page that was loaded anew goes on where it was. */
export class KeptSetting {
  private setting: SpotSetting;

  constructor(private readonly rigId: string) {
    this.setting = this.read();
  }

  get now(): SpotSetting {
    return this.setting;
  }

  /** Changes it here and on the device; a browser that refuses storage keeps it for this page only. */
  change(part: Partial<SpotSetting>): SpotSetting {
    this.setting = { ...this.setting, ...part };
    try {
      window.localStorage.setItem(this.key, JSON.stringify(this.setting));
    } catch {
      return this.setting;
    }
    return this.setting;
  }

  private get key(): string {
    return `evenfall.spot.${this.rigId}`;
  }

  /** A fresh one where there is none, it is of another version, or the browser refuses storage. */
  private read(): SpotSetting {
    try {
      const text = window.localStorage.getItem(this.key);
      const parsed = text === null ? null : spotSettingSchema.safeParse(JSON.parse(text));
      return parsed?.success ? parsed.data : freshSetting;
    } catch {
      return freshSetting;
    }
  }
}
