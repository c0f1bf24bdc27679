import type { DoorCard } from '@/shared/contracts/doors';

/** What the card says in large letters, and under it. */
export const doorWords: Record<DoorCard['state'], { headline: string; why: string }> = {
  run: { headline: 'Do not enter', why: 'A measurement is on. Steps, doors and lights spoil it, and heavy masses move without warning.' },
  armed: { headline: 'Do not enter', why: 'The rig is armed: heavy masses may begin to move at any moment, started from afar.' },
  hands: { headline: 'Somebody works here', why: 'The rig is locked by a person whose hands are in it. Nothing moves. Knock first.' },
  free: { headline: 'No measurement is on', why: 'The rig is not armed: no run can start. Ask before you touch anything.' },
};
