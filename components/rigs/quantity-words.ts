import { formatFixed, formatSignificant, NARROW_SPACE, unitSign } from '@/shared/lib/format-number';
import type { DocumentRow } from './document-rows';

interface Scale {
  factor: number;
  unit: string;
}

/** Lengths of apparatus read best in mm, wires in µm, small masses in g, moduli in GPa, small angles in mrad and µrad. */
function scaleOf(size: number, unit: string): Scale {
  if (unit === 'm') return size >= 1 ? { factor: 1, unit: 'm' } : size >= 1e-4 ? { factor: 1e3, unit: 'mm' } : { factor: 1e6, unit: 'µm' };
  if (unit === 'kg') return size >= 0.5 ? { factor: 1, unit: 'kg' } : { factor: 1e3, unit: 'g' };
  if (unit === 'Pa') return size >= 1e8 ? { factor: 1e-9, unit: 'GPa' } : { factor: 1, unit: 'Pa' };
  if (unit === 'deg') return { factor: 1, unit: '°' };
  const rad = /^rad(\/.*)?$/.exec(unit);
  if (rad !== null) return size >= 1e-3 ? { factor: 1e3, unit: `mrad${rad[1] ?? ''}` } : { factor: 1e6, unit: `µrad${rad[1] ?? ''}` };
  return { factor: 1, unit: unitSign(unit) };
}

/** Decimals that show u with two digits, as GUM 7.2.6 asks. */
const decimalsFor = (u: number) => Math.min(9, Math.max(0, 1 - Math.floor(Math.log10(u))));

export interface QuantityWords {
  value: string;
  /** `± 0.05`; empty where there is no uncertainty. */
  u: string;
  unit: string;
}

/** A row in the units people read: value and u to the same decimal place. */
export function quantityWords(row: DocumentRow): QuantityWords {
  if (row.kind === 'words') return { value: row.words, u: '', unit: '' };
  const u = row.kind === 'quantity' ? row.u : 0;
  const { factor, unit } = scaleOf(Math.max(Math.abs(row.value), u), row.unit);
  if (u === 0) return { value: plain(row.value * factor), u: row.kind === 'quantity' ? 'exact' : '', unit };
  const decimals = decimalsFor(u * factor);
  return { value: formatFixed(row.value * factor, { decimals }), u: `±${NARROW_SPACE}${formatFixed(u * factor, { decimals })}`, unit };
}

const plain = (value: number) =>
  Number.isInteger(value)
    ? formatFixed(value, { decimals: 0 })
    : formatSignificant(value, 6)
        .replace(/(\.\d*?)[0\u202f]+$/, '$1')
        .replace(/\.$/, '');

/** The same on one line: `75.000 ± 0.050 mm`. */
export function quantityLine(row: DocumentRow | null): string {
  if (row === null) return 'absent';
  const { value, u, unit } = quantityWords(row);
  const space = unit === '°' || unit === '' ? '' : ' ';
  return [value, u].filter(Boolean).join(' ') + space + unit;
}
