import type { RehearsalParts } from '../engine/rehearsal/rehearsal-parts';
import { sha256Hex } from '../evaluation/sha256';
import { createEmulatedController } from '../links/board/board-controller';
import { createLink } from '../links/link-driver';
import { createSimulatedController } from '../links/simulated-controller';

/** Every so many turns the event loop gets one, so that a rehearsal in a server starves nothing for long. */
const TURNS_BETWEEN_BREATHS = 2000;

/**
 * Lets all promises that are under way do their work: Node runs its microtasks, with all that they start, before the next tick.
 * In a rehearsal nothing waits for anything else, because link, store and clock are all in memory.
 */
function createSettle(): () => Promise<void> {
  let turns = 0;
  return () => {
    turns += 1;
    if (turns % TURNS_BETWEEN_BREATHS === 0) return new Promise((resolve) => setImmediate(resolve));
    return new Promise((resolve) => process.nextTick(resolve));
  };
}

/** The parts of every rehearsal: the real link and codec, on the light simulated controller or on the emulated board. */
export const rehearsalParts = (controller: 'light' | 'board' = 'light'): RehearsalParts => ({
  sha256: sha256Hex,
  settle: createSettle(),
  createLink,
  createController: controller === 'board' ? createEmulatedController : createSimulatedController,
});
