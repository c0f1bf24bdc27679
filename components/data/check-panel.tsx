import { View } from 'react-native';
import { Body, Icon, Label, Num, Panel } from '@/components/ui';
import type { ImportCheck } from '@/shared/contracts/data';
import { formatFixed, formatSignificant } from '@/shared/lib/format-number';
import { formatClock, formatDay, zoneName } from '@/shared/lib/format-time';

/** What the whole file came to with this mapping: its span, or every problem by row and column. */
export function CheckPanel({ check, timeZone }: { check: ImportCheck; timeZone: string }) {
  const { outOfReach } = check.findings;
  const leavable = outOfReach.leavable && outOfReach.rows === check.problemCount;
  const rows = formatFixed(check.rows, { decimals: 0 });
  const instant = (at: string) =>
    `${formatDay(Date.parse(at), timeZone)} ${formatClock(Date.parse(at), { timeZone, precision: 'seconds' })}`;
  return (
    <Panel edge={check.ok ? 'good' : 'danger'} className="gap-3" testID="import-check">
      <View role={check.ok ? 'status' : 'alert'} className="flex-row items-center gap-2">
        <Icon name={check.ok ? 'passed' : 'failed'} tone={check.ok ? 'good' : 'danger'} />
        <Body strong className="shrink">
          {check.ok
            ? `All ${rows} rows can be read.`
            : `${check.problemCount} problem${check.problemCount === 1 ? '' : 's'} in ${rows} rows.${leavable ? '' : ' Nothing is stored until there are none.'}`}
        </Body>
      </View>
      {check.firstAt === null || check.lastAt === null ? null : (
        <Label>
          From <Num size={13}>{instant(check.firstAt)}</Num> to <Num size={13}>{instant(check.lastAt)}</Num>, {zoneName(timeZone)}
          {check.medianIntervalS === null ? '' : `, a sample every ${formatSignificant(check.medianIntervalS, 3)} s`}
        </Label>
      )}
      {check.overlap === '' ? null : <Body>{check.overlap.charAt(0).toUpperCase() + check.overlap.slice(1)}.</Body>}
      {check.problems.length === 0 ? null : <Problems check={check} />}
    </Panel>
  );
}

function Problems({ check }: { check: ImportCheck }) {
  const hidden = check.problemCount - check.problems.length;
  return (
    <View className="gap-1">
      <div className="max-h-[320px] overflow-y-auto" tabIndex={0} role="region" aria-label="Problems by row">
        <table className="w-full border-collapse">
          <thead>
            <tr className="border-b border-line">
              {['Row', 'Column', 'Problem'].map((title) => (
                <th key={title} scope="col" className="py-1.5 pr-4 text-left font-sans text-13 font-regular text-dim">
                  {title}
                </th>
              ))}
            </tr>
          </thead>
          <tbody>
            {check.problems.map((problem, index) => (
              <tr key={index} className="border-b border-line" data-testid="import-problem">
                <td className="py-2 pr-4 align-top">
                  <Num size={13}>{problem.row ?? '–'}</Num>
                </td>
                <td className="py-2 pr-4 align-top">
                  <Label>{problem.column ?? ''}</Label>
                </td>
                <td className="py-2 align-top">
                  <Body size={15}>{problem.message}</Body>
                </td>
              </tr>
            ))}
          </tbody>
        </table>
      </div>
      {hidden > 0 ? <Label>{hidden} more are not listed. Correct these first.</Label> : null}
    </View>
  );
}
