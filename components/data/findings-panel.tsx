import type { ReactNode } from 'react';
import { View } from 'react-native';
import { Body, Icon, Label, Num, Panel, Select } from '@/components/ui';
import type { ImportChoices, ImportFindings } from '@/shared/contracts/data';
import { formatDuration } from '@/shared/lib/format-duration';
import { formatFixed, unitSign } from '@/shared/lib/format-number';
import { formatClock, formatDay, zoneName } from '@/shared/lib/format-time';

interface FindingsPanelProps {
  findings: ImportFindings;
  choices: ImportChoices;
  channelName: string;
  /** Of the values, as the mapping says. */
  unit: string;
  /** Of the lab. */
  timeZone: string;
  onChoice: (change: Partial<ImportChoices>) => void;
}

const count = (number: number) => formatFixed(number, { decimals: 0 });
const rows = (number: number) => `${count(number)} ${number === 1 ? 'row' : 'rows'}`;

/** How the file stands to the run and to what its channel holds, and what is to become of it. */
export function FindingsPanel(props: FindingsPanelProps) {
  const { findings, channelName } = props;
  const { held, fresh, equal, different, among, outOfReach, outsideRun, gaps } = findings;
  return (
    <Panel className="gap-4" testID="import-findings">
      <Body>
        {held === 0
          ? `${channelName} holds nothing in this time: all rows are new.`
          : `${channelName} holds ${count(held)} samples in this time. ${rows(fresh)} of the file ${fresh === 1 ? 'is' : 'are'} new${equal > 0 ? `; ${rows(equal)} ${equal === 1 ? 'is' : 'are'} stored already with the same value, and nothing is stored twice` : ''}.`}
      </Body>
      {different > 0 ? <Different {...props} /> : null}
      {among.rows > 0 ? <Among {...props} /> : null}
      {outOfReach.leavable ? <OutOfReach {...props} /> : null}
      {outsideRun.before + outsideRun.after > 0 ? <OutsideRun {...props} /> : null}
      {gaps.count > 0 ? <Gaps {...props} /> : null}
    </Panel>
  );
}

function Finding({ sentence, choose, children }: { sentence: string; choose?: boolean; children?: ReactNode }) {
  return (
    <View className="gap-2 border-t border-line pt-4">
      <View className="flex-row items-start gap-2">
        <Icon name={choose === true ? 'warning' : 'note'} tone={choose === true ? 'lamp' : 'dim'} />
        <Body className="shrink">{sentence}</Body>
      </View>
      {children}
    </View>
  );
}

const unchosen = { value: 'refuse' as const, label: 'choose…' };

function Different({ findings, choices, channelName, unit, timeZone, onChoice }: FindingsPanelProps) {
  const { different, differing, frozen } = findings;
  const open = choices.sameInstant === 'refuse';
  const keep = { value: 'keep' as const, label: 'what is stored' };
  const replace = { value: 'replace' as const, label: 'the value of the file' };
  return (
    <Finding
      choose={open}
      sentence={`${rows(different)} of the file ${different === 1 ? 'has' : 'have'} another value than ${channelName} holds at the same instant.`}
    >
      <Table
        label="Rows with another value"
        titles={['Row', `Time, ${zoneName(timeZone)}`, `Stored, ${unitSign(unit)}`, `In the file, ${unitSign(unit)}`]}
        lines={differing.map(({ row, at, stored, inFile }) => [String(row), clockOf(at, timeZone), String(stored), String(inFile)])}
        more={different - differing.length}
      />
      <View className="wide:w-[270px]">
        <Select
          label="What counts"
          value={choices.sameInstant}
          options={[...(open ? [unchosen] : []), keep, ...(frozen ? [] : [replace])]}
          onChange={(sameInstant) => onChoice({ sameInstant })}
          hint={frozen ? 'A frozen evaluation stands on that night: nothing of it is replaced.' : undefined}
          testID="same-instant"
        />
      </View>
    </Finding>
  );
}

function Among({ findings: { among }, choices, channelName, timeZone, onChoice }: FindingsPanelProps) {
  const open = choices.among === 'refuse';
  const told = among.stretches.reduce((sum, stretch) => sum + stretch.rows, 0);
  return (
    <Finding
      choose={open}
      sentence={`${rows(among.rows)} ${among.rows === 1 ? 'falls' : 'fall'} among samples that ${channelName} holds at other instants: two records of the same time.`}
    >
      <Table
        label="Stretches with two records"
        titles={['From', 'To', 'Rows', 'Stored']}
        lines={among.stretches.map(({ fromAt, toAt, rows: own, held }) => [
          clockOf(fromAt, timeZone),
          clockOf(toAt, timeZone),
          count(own),
          count(held),
        ])}
        more={told < among.rows ? among.rows - told : 0}
      />
      <View className="wide:w-[270px]">
        <Select
          label="Such rows are"
          value={choices.among}
          options={[
            ...(open ? [unchosen] : []),
            { value: 'leave-out', label: 'left out' },
            { value: 'both', label: 'stored beside the others' },
          ]}
          onChange={(chosen) => onChoice({ among: chosen })}
          testID="rows-among"
        />
      </View>
    </Finding>
  );
}

function OutOfReach({ findings: { outOfReach }, choices, onChoice }: FindingsPanelProps) {
  const open = choices.outOfReach === 'refuse';
  return (
    <Finding
      choose={open}
      sentence={`${rows(outOfReach.rows)} ${outOfReach.rows === 1 ? 'lies' : 'lie'} beyond the reach of the pendulum, as listed above.`}
    >
      <View className="wide:w-[270px]">
        <Select
          label="Values out of reach"
          value={choices.outOfReach}
          options={[...(open ? [unchosen] : []), { value: 'leave-out', label: 'leave such rows out' }]}
          onChange={(chosen) => onChoice({ outOfReach: chosen })}
          testID="out-of-reach"
        />
      </View>
    </Finding>
  );
}

function OutsideRun({ findings: { outsideRun }, choices, onChoice }: FindingsPanelProps) {
  const { before, after } = outsideRun;
  const parts = [
    ...(before > 0 ? [`${rows(before)} from before the run began`] : []),
    ...(after > 0 ? [`${rows(after)} from after it ended`] : []),
  ];
  return (
    <Finding sentence={`The file has ${parts.join(' and ')}.`}>
      <View className="wide:w-[270px]">
        <Select
          label="Rows outside the run are"
          value={choices.outsideRun}
          options={[
            { value: 'store', label: 'stored too' },
            { value: 'leave-out', label: 'left out' },
          ]}
          onChange={(chosen) => onChoice({ outsideRun: chosen })}
          testID="outside-run"
        />
      </View>
    </Finding>
  );
}

function Gaps({ findings: { gaps }, channelName, timeZone }: FindingsPanelProps) {
  return (
    <Finding
      sentence={`The file has ${gaps.count === 1 ? 'a gap' : `${count(gaps.count)} gaps`}, ${formatDuration(gaps.totalS)}${gaps.count === 1 ? '' : ' together'}. Gaps stay gaps: nothing is filled in.`}
    >
      <Table
        label="Gaps of the file"
        titles={['From', 'To', `In ${channelName}`]}
        lines={gaps.longest.map(({ fromAt, toAt, held }) => [
          clockOf(fromAt, timeZone),
          clockOf(toAt, timeZone),
          held === 0 ? 'nothing' : `${count(held)} samples`,
        ])}
        more={gaps.count - gaps.longest.length}
      />
    </Finding>
  );
}

const clockOf = (at: string, timeZone: string) =>
  `${formatDay(Date.parse(at), timeZone)} ${formatClock(Date.parse(at), { timeZone, precision: 'ms' })}`;

/** @param more so many more are not listed */
function Table({ label, titles, lines, more }: { label: string; titles: readonly string[]; lines: readonly string[][]; more: number }) {
  return (
    <View className="gap-1">
      <div className="max-h-[240px] overflow-auto" tabIndex={0} role="region" aria-label={label}>
        <table className="border-collapse">
          <thead>
            <tr className="border-b border-line">
              {titles.map((title) => (
                <th key={title} scope="col" className="py-1.5 pr-4 text-left font-sans text-13 font-regular text-dim">
                  {title}
                </th>
              ))}
            </tr>
          </thead>
          <tbody>
            {lines.map((line, index) => (
              <tr key={index} className="border-b border-line">
                {line.map((cell, place) => (
                  <td key={place} className="whitespace-nowrap py-1.5 pr-4 align-top">
                    <Num size={13}>{cell}</Num>
                  </td>
                ))}
              </tr>
            ))}
          </tbody>
        </table>
      </div>
      {more > 0 ? <Label>{count(more)} more are not listed.</Label> : null}
    </View>
  );
}
