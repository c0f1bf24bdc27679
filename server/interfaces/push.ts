/** A browser that takes push messages. */
export interface PushTarget {
  endpoint: string;
  p256dh: string;
  auth: string;
}

export interface PushPort {
  /** Public key with which messages are signed, base64url. */
  publicKey(): Promise<string>;
  /** `gone`: the browser takes none any more and is to be forgotten. Rejects where the message could not be handed over. */
  send(target: PushTarget, message: PushMessage): Promise<'sent' | 'gone'>;
}

/** What the service worker shows; read by `public/push-handler.js`. */
export interface PushMessage {
  title: string;
  body: string;
  /** Path within the application. */
  path: string;
  /** A later message with the same tag takes the place of the earlier one. */
  tag: string;
  /** Without a sound: nobody is to be woken by it. */
  quiet: boolean;
}
