import type { TimeSpan } from '@/components/charts/time-plot-types';

/** What the plots of a run show, as the address of the page keeps it. Pure. */

export interface ViewAddress {
  /** Null: the whole run. */
  span: TimeSpan | null;
  cursor: number | null;
  /** Channels that are opened under the deflection; null: the usual ones. */
  panes: readonly string[] | null;
}

export interface AddressParams {
  from?: string | undefined;
  to?: string | undefined;
  /** A moment: the cursor stands there. */
  at?: string | undefined;
  panes?: string | undefined;
}

/** What is shown on both sides of a moment that comes without a stretch, ms. */
const aroundMs = 300_000;
const none = 'none';

const instantOf = (text: string | undefined): number | null => {
  const at = Date.parse(text ?? '');
  return Number.isNaN(at) ? null : at;
};

/** What cannot be read, as when somebody has cut the address short, counts as not there. */
export function readAddress({ from, to, at, panes }: AddressParams): ViewAddress {
  const [begin, end, cursor] = [instantOf(from), instantOf(to), instantOf(at)];
  const stretch = begin !== null && end !== null && end > begin ? { from: begin, to: end } : null;
  const around = cursor === null ? null : { from: cursor - aroundMs, to: cursor + aroundMs };
  return { span: stretch ?? around, cursor, panes: panes === undefined ? null : panes.split(',').filter((id) => id !== none && id !== '') };
}

const isoOf = (utcMs: number) => new Date(utcMs).toISOString();

/** The whole instants around a stretch; nothing is said of the whole run. */
export const writeStretch = (span: TimeSpan | null): Pick<AddressParams, 'from' | 'to'> =>
  span === null ? { from: undefined, to: undefined } : { from: isoOf(Math.floor(span.from)), to: isoOf(Math.ceil(span.to)) };

export const writePanes = (panes: readonly string[]): string => (panes.length === 0 ? none : panes.join(','));
