/** What tells one USB adapter or board from another, as the operating system lists it. */
export interface UsbIdentity {
  vendorId: string;
  productId: string;
  serialNumber: string;
}

/** A serial port of this computer. */
export interface ListedPort {
  path: string;
  /** The same port under a name that does not change when plugs are changed; null where there is none. */
  stablePath: string | null;
  /** The maker's words; null where the port has none. */
  label: string | null;
  /** Null for a port that is not on USB, or does not tell apart from its like. */
  usb: UsbIdentity | null;
}
