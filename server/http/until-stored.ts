import type { Services } from './services';

const retryMs = 5_000;
/** An hour: the journals of the runs hold out as long. */
const mostTries = 720;

/** Writes something when the database can be reached; nobody waits for it. */
export function untilStored(services: Pick<Services, 'background' | 'clock'>, write: () => Promise<unknown>, what: string): void {
  services.background(stored(services, write), what);
}

async function stored({ clock }: Pick<Services, 'clock'>, write: () => Promise<unknown>): Promise<void> {
  for (let tries = 1; ; tries += 1) {
    try {
      await write();
      return;
    } catch (error) {
      if (tries === mostTries) throw error;
      await new Promise<void>((resolve) => void clock.after(retryMs, resolve));
    }
  }
}
