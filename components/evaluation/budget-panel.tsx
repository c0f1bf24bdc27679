import { useState } from 'react';
import { View } from 'react-native';
import { BudgetBars } from '@/components/charts';
import { Body, Button, Label, Num, Section, useWide } from '@/components/ui';
import { inputWords, isCorrelation, unitOfInput } from '@/shared/evaluation/input-words';
import { monteCarloWords } from '@/shared/evaluation/monte-carlo-words';
import type { BudgetLine, EvaluationResult } from '@/shared/evaluation/result';
import { formatPercent, UNIT_OF_G, unitSign } from '@/shared/lib/format-number';
import { formatExact, uncertainParts } from '@/shared/lib/format-uncertain';
import type { RigDocument } from '@/shared/rig/document';

interface BudgetPanelProps {
  result: EvaluationResult;
  rig: RigDocument | null;
}

/** Where the uncertainty comes from: bars by share, on demand the table with sensitivities, and what drawn inputs give. */
export function BudgetPanel({ result, rig }: BudgetPanelProps) {
  const [table, setTable] = useState(false);
  const lines = result.budget;
  const trials = monteCarloWords(result);
  if (lines === null || lines.length === 0) return null;
  return (
    <Section title="Budget of uncertainty" remark="Share of each input in the square of u(G).">
      <BudgetBars lines={lines} />
      <Button
        label={table ? 'Hide the table' : 'Show the table'}
        onPress={() => setTable(!table)}
        expanded={table}
        className="self-start"
        testID="budget-table-toggle"
      />
      {table ? <BudgetTable lines={lines} rig={rig} /> : null}
      {trials === null ? null : <Body testID="monte-carlo">{trials}</Body>}
    </Section>
  );
}

const cell = 'py-2.5 pr-5 align-top';
const right = `${cell} text-right`;

/** Powers of ten alone, as an uncertainty of an uncertainty means nothing here. */
const scientific = (x: number) => formatExact({ value: x });

function BudgetTable({ lines, rig }: { lines: readonly BudgetLine[]; rig: RigDocument | null }) {
  const wide = useWide();
  const sorted = [...lines].sort((a, b) => b.share - a.share);
  const titles = wide ? ['Input', 'Value and u', 'Contribution to u(G)', 'Share'] : ['Input, value and u', 'Share'];
  return (
    <div className="overflow-x-auto" tabIndex={0} role="region" aria-label="Budget of uncertainty as a table">
      <table className="w-full border-collapse" data-testid="budget-table">
        <thead>
          <tr className="border-b border-line">
            {titles.map((title, index) => (
              <th
                key={title}
                scope="col"
                className={`py-2 font-sans text-13 font-regular text-dim ${index === titles.length - 1 ? '' : 'pr-5'} ${index === 0 ? 'text-left' : 'text-right'}`}
              >
                {title}
              </th>
            ))}
          </tr>
        </thead>
        <tbody>
          {sorted.map((line) => (
            <BudgetRow key={line.input} line={line} unit={unitOfInput(line.input, rig)} wide={wide} />
          ))}
        </tbody>
      </table>
    </div>
  );
}

/** On a phone what belongs to one input stands under its name, so that its share is on the page too. */
function BudgetRow({ line, unit, wide }: { line: BudgetLine; unit: string; wide: boolean }) {
  const together = isCorrelation(line.input);
  const value = uncertainParts({ value: line.value, u: together ? null : line.u, unit });
  const figures = (
    <>
      <Num className="whitespace-nowrap">
        {`${together ? 'r = ' : ''}${value.value}${value.uncertainty}${value.factor}`}
        <Label>{value.unit}</Label>
      </Num>
      {together ? null : (
        <Label className={wide ? 'block text-right' : 'block'}>
          ∂G/∂input <Num size={13}>{scientific(line.sensitivity)}</Num> {UNIT_OF_G}
          {unit === '' ? '' : ` per\u00a0${unitSign(unit)}`}
        </Label>
      )}
    </>
  );
  const contribution = (
    <>
      <Num size={wide ? 15 : 13} className="whitespace-nowrap">
        {scientific(line.contribution)}
      </Num>
      <Label> {UNIT_OF_G}</Label>
    </>
  );
  return (
    <tr className="border-b border-line" data-testid="budget-row">
      <th scope="row" className={`${cell} text-left ${wide ? '' : 'w-full'}`}>
        <Body>{inputWords(line.input)}</Body>
        <View>
          <Label className="font-mono">{line.input}</Label>
        </View>
        {wide ? null : (
          <View className="pt-1">
            {figures}
            <Label>to u(G) {contribution}</Label>
          </View>
        )}
      </th>
      {wide ? <td className={right}>{figures}</td> : null}
      {wide ? <td className={right}>{contribution}</td> : null}
      <td className="py-2.5 text-right align-top">
        <Num className="whitespace-nowrap">{formatPercent(line.share)}</Num>
      </td>
    </tr>
  );
}
