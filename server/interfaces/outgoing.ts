/** A request to an address that somebody typed in. */
export interface OutgoingRequest {
  url: string;
  method: 'GET' | 'POST';
  headers?: Readonly<Record<string, string>>;
  body?: Uint8Array | null;
}

/** Sends requests to the outside; refuses addresses of the own network, follows no redirect, waits 5 s at most. */
export interface OutgoingPort {
  /** @throws RefusedAddress, or whatever kept the answer from coming */
  send(request: OutgoingRequest): Promise<{ status: number }>;
}

/** An address to which nothing is sent, with a sentence that says which would be right. */
export class RefusedAddress extends Error {
  override readonly name = 'RefusedAddress';
}
