import type { Picture } from '@/shared/camera/picture';

/** A camera of the network. */
export interface CameraAddress {
  address: string;
  userName: string | null;
  password: string | null;
}

/** Asks cameras for pictures: only at hosts that the configuration names, without redirects, within bounds of size and time. */
export interface CameraPort {
  /** @throws NoPicture, also where `signal` ends the wait */
  take(camera: CameraAddress, signal?: AbortSignal): Promise<Picture>;
}

/** There is no picture; says in a clause why, and what would be right. */
export class NoPicture extends Error {
  override readonly name = 'NoPicture';
}
