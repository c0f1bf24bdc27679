import { Label } from '@/components/ui';

interface PreviewTableProps {
  rows: readonly string[][];
  names: readonly string[];
  headerRow: boolean;
  timeColumn: number | null;
  valueColumn: number | null;
}

const role = (index: number, timeColumn: number | null, valueColumn: number | null) =>
  index === timeColumn ? 'time' : index === valueColumn ? 'deflection' : '';

/** The first rows of the file; the two columns that will be read are marked by word and frame. */
export function PreviewTable({ rows, names, headerRow, timeColumn, valueColumn }: PreviewTableProps) {
  const body = rows.slice(headerRow ? 1 : 0, (headerRow ? 1 : 0) + 6);
  return (
    <div
      className="overflow-x-auto rounded-panel bg-panel p-3"
      tabIndex={0}
      role="region"
      aria-label="First rows of the file"
      data-testid="import-preview"
    >
      <table className="border-collapse">
        <thead>
          <tr>
            {names.map((name, index) => (
              <th key={`${index} ${name}`} scope="col" className="border-b border-line px-3 py-1 text-left align-bottom">
                <Label tone={role(index, timeColumn, valueColumn) === '' ? 'dim' : 'lamp'} className="whitespace-nowrap">
                  {name}
                </Label>
                <div>
                  <Label tone="lamp" className="font-strong">
                    {role(index, timeColumn, valueColumn) || '\u00a0'}
                  </Label>
                </div>
              </th>
            ))}
          </tr>
        </thead>
        <tbody>
          {body.map((row, line) => (
            <tr key={line}>
              {names.map((name, index) => (
                <td key={`${index} ${name}`} className="px-3 py-1">
                  <Label
                    tone={role(index, timeColumn, valueColumn) === '' ? 'dim' : 'text'}
                    className="whitespace-nowrap font-mono tabular"
                  >
                    {row[index] ?? ''}
                  </Label>
                </td>
              ))}
            </tr>
          ))}
        </tbody>
      </table>
    </div>
  );
}
