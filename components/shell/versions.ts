/** The built program as kept on this device by public/service-worker.js, and how a newer one takes its place: never by itself. */

/** What is needed of the browser; without https only a page of the machine itself has it. */
interface Browser {
  serviceWorker: Pick<ServiceWorkerContainer, 'register' | 'controller' | 'addEventListener'>;
  reload(): void;
  /** Calls `look` now and then, and when the page is seen again. */
  nowAndThen(look: () => void): void;
}

const useIt = 'use-new-version';

/**
 * Lets the browser keep the program, and tells once a newer one has been fetched whole. What it tells is the way to go over to it: only this page
 * is loaded anew then, no other that is open.
 */
export async function keepProgram({ serviceWorker, reload, nowAndThen }: Browser, tell: (go: () => void) => void): Promise<void> {
  const registration = await serviceWorker.register('/service-worker.js', { updateViaCache: 'none' });
  const look = () => {
    const { waiting } = registration;
    // Without one in charge this is the first visit, and the page is of the newest program.
    if (waiting === null || serviceWorker.controller === null) return;
    tell(() => {
      serviceWorker.addEventListener('controllerchange', reload, { once: true });
      waiting.postMessage(useIt);
    });
  };
  look();
  registration.addEventListener('updatefound', () => registration.installing?.addEventListener('statechange', look));
  nowAndThen(() => void registration.update().catch(() => undefined));
}

/** Where nothing is being done that a new start of the page would break off: the lists. Never at a run, at a rig or in an editor. */
export const mayOffer = (pathname: string): boolean => /^\/(rigs|protocols|runs|calendar|lab)?$/.test(pathname);
