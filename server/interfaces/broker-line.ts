/** One connection to an MQTT broker, from the attempt to its end; who wants another opens another. */

export interface BrokerSetting {
  /** `mqtt://host:1883` or `mqtts://host:8883`. */
  address: string;
  clientId: string;
  userName: string | null;
  password: string | null;
  /** PEM; null: what the system trusts. */
  ca: string | null;
  filters: readonly string[];
}

export interface BrokerMessage {
  topic: string;
  payload: Uint8Array;
  /** Kept by the broker from before the subscription. */
  retained: boolean;
}

export interface BrokerListener {
  /** Connected, and all topics are subscribed to. */
  connected(): void;
  /** Once, at its end: why, in words. Nothing follows. */
  away(reason: string): void;
  message(message: BrokerMessage): void;
}

export type OpenBrokerLine = (setting: BrokerSetting, listener: BrokerListener) => { close(): void };
