import { FLAG, type EventMessage, type Happening, type MachineState, type OkBody, type Reply } from '@/firmware-protocol/codec';
import type { RigMotion } from '@/shared/rig/document';
import type { ControllerState, UnheardOpening } from '../interfaces/turntable-link';
import { degOfSteps } from './rig-units';

/** The controller's state as last told: by a reply, then by the events after it. */
export class ControllerReport {
  private state: MachineState = 'rest';
  private position: number | null = null;
  private flags = 0;
  /** The event up to which the state is known. */
  private event = 0;
  private atUs = 0;
  /** Lines that the controller dropped since its start, modulo 65536. */
  dropped: number | null = null;
  /** Whether anything was told yet. */
  known = false;
  /** The last of what lets somebody in, or loses the position, that happened before anybody here listened. */
  private pastOpening: { input: UnheardOpening['input']; atUs: number } | null = null;

  constructor(private readonly rig: RigMotion) {}

  forget(): void {
    this.known = false;
    this.event = 0;
    this.atUs = 0;
    this.dropped = null;
    this.pastOpening = null;
  }

  /** A reply that is older than what is known changes nothing. */
  takeReply({ receivedUs }: Reply, body: OkBody): void {
    if (this.known && (receivedUs < this.atUs || body.event < this.event)) return;
    this.known = true;
    this.state = body.state;
    this.position = body.position;
    this.flags = body.flags;
    this.event = body.event;
    this.dropped = body.dropped;
    this.atUs = receivedUs;
  }

  /** An event that the last reply had not seen yet. */
  takeEvent({ number, atUs, what }: EventMessage, { isPast }: { isPast: boolean }): void {
    const input = isPast ? inputOf(what) : null;
    if (input !== null) this.pastOpening = { input, atUs };
    if (number <= this.event) return;
    this.event = number;
    this.atUs = Math.max(this.atUs, atUs);
    switch (what.word) {
      case 'began':
        this.state = 'moving';
        return this.set(FLAG.warningDue, false);
      case 'ended':
        this.state = 'rest';
        this.place(what.position);
        return;
      case 'homed':
        return this.place(0);
      case 'interlock':
        this.set(FLAG.interlockClosed, what.closed);
        return what.closed ? undefined : this.set(FLAG.warningDue, true);
      case 'supply':
        this.set(FLAG.supplyPresent, what.present);
        return what.present ? undefined : this.place(null);
      case 'key':
        return this.set(FLAG.armKey, what.on);
    }
  }

  get atRest(): boolean {
    return this.state === 'rest' || this.state === 'fault';
  }

  /** Number of the event up to which the state holds, and the controller time at which it was told, µs. */
  get upTo(): { event: number; atUs: number } {
    return { event: this.event, atUs: this.atUs };
  }

  has(flag: number): boolean {
    return (this.flags & flag) !== 0;
  }

  get angleDeg(): number | null {
    return this.angleOf(this.has(FLAG.positionKnown) ? this.position : null);
  }

  angleOf(position: number | null): number | null {
    return position === null ? null : degOfSteps(this.rig, position);
  }

  /** By the time that has passed on the controller's own clock; `nowUtcMs` is late by what passed since its last reply, half a second at most. */
  unheard(nowUtcMs: number): UnheardOpening | null {
    const { pastOpening, atUs } = this;
    return pastOpening === null ? null : { input: pastOpening.input, utcMs: nowUtcMs - (atUs - pastOpening.atUs) / 1000 };
  }

  view(bootId: string, firmware: string): ControllerState | null {
    if (!this.known) return null;
    return {
      bootId,
      firmware,
      positionKnown: this.angleDeg !== null,
      angleDeg: this.angleDeg,
      moving: this.state === 'moving' || this.state === 'homing' || this.state === 'braking',
      interlockClosed: this.has(FLAG.interlockClosed),
      supplyPresent: this.has(FLAG.supplyPresent),
      armKey: this.has(FLAG.armKey),
      driversOn: this.has(FLAG.driversOn),
      homeFlagCovered: this.has(FLAG.homeFlag),
      leaseLive: this.has(FLAG.leaseLive),
      warningDue: this.has(FLAG.warningDue),
    };
  }

  private place(position: number | null): void {
    this.position = position;
    this.set(FLAG.positionKnown, position !== null);
  }

  private set(flag: number, on: boolean): void {
    this.flags = on ? this.flags | flag : this.flags & ~flag;
  }
}

function inputOf(what: Happening): UnheardOpening['input'] | null {
  if (what.word === 'interlock') return what.closed ? null : 'interlock';
  if (what.word === 'supply') return what.present ? null : 'supply';
  return what.word === 'key' && !what.on ? 'arm-key' : null;
}
