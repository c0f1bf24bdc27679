/** Where what a warning is about can be looked at: a page, or the first dwell that does not count. Pure. */
export type WarningPlace = { label: string; href: string } | { label: string; dwell: true };

type Run = { id: string; rigId: string };

const dwell = () => ({ label: 'Show the first dwell that does not count', dwell: true }) as const;
const data = ({ id }: Run) => ({ label: 'Look at the data', href: `/runs/${id}/data` });
const log = ({ id }: Run) => ({ label: 'Look at the step log', href: `/runs/${id}/log` });
const rig = ({ rigId }: Run) => ({ label: 'Look at the rig', href: `/rigs/${rigId}` });
const stations = ({ rigId }: Run) => ({ label: 'Look at the stations', href: `/rigs/${rigId}/stations` });

const places: Record<string, (run: Run) => WarningPlace> = {
  'few-dwells': dwell,
  'not-alternating': dwell,
  'clock-offset': data,
  'clock-poorly-known': data,
  environment: data,
  'environment-unreadable': data,
  'excluded-by-hand': data,
  'period-disagrees': rig,
  'decay-disagrees': rig,
  'decay-unknown': rig,
  'near-not-positive': stations,
  sign: stations,
  'no-chain': log,
  'no-archived-event': log,
};

/** Null where there is nothing to look at. */
export const placeOfWarning = (code: string, run: Run): WarningPlace | null => places[code]?.(run) ?? null;
