import { View } from 'react-native';

interface HiddenTableProps {
  caption: string;
  columns: readonly string[];
  rows: readonly (readonly string[])[];
  /** Said after the table, for example how many rows were left out. */
  remark?: string | undefined;
}

/** A chart's figures as a table that only a screen reader meets: a picture says nothing to those who do not see it. */
export function HiddenTable({ caption, columns, rows, remark }: HiddenTableProps) {
  return (
    <View className="sr-only">
      <table>
        <caption>{caption}</caption>
        <thead>
          <tr>
            {columns.map((column) => (
              <th key={column} scope="col">
                {column}
              </th>
            ))}
          </tr>
        </thead>
        <tbody>
          {rows.map((cells, index) => (
            <tr key={`${index} ${cells[0] ?? ''}`}>
              {cells.map((cell, column) => (
                <td key={columns[column] ?? column}>{cell}</td>
              ))}
            </tr>
          ))}
        </tbody>
      </table>
      {remark === undefined ? null : <p>{remark}</p>}
    </View>
  );
}
