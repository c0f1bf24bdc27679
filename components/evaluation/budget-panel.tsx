import { useState } from 'react';
import { View } from 'react-native';
import { BudgetBars } from '@/components/charts';
import { Body, Button, Label, Num, Section } from '@/components/ui';
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
  const sorted = [...lines].sort((a, b) => b.share - a.share);
  return (
    <div className="overflow-x-auto" tabIndex={0} role="region" aria-label="Budget of uncertainty as a table">
      <table className="border-collapse" data-testid="budget-table">
        <thead>
          <tr className="border-b border-line">
            {['Input', 'Value and u', 'Sensitivity ∂G/∂input', 'Contribution to u(G)', 'Share'].map((title, index) => (
              <th
                key={title}
                scope="col"
                className={`whitespace-nowrap py-2 pr-5 font-sans text-13 font-regular text-dim ${index === 0 ? 'text-left' : 'text-right'}`}
              >
                {title}
              </th>
            ))}
          </tr>
        </thead>
        <tbody>
          {sorted.map((line) => (
            <BudgetRow key={line.input} line={line} unit={unitOfInput(line.input, rig)} />
          ))}
        </tbody>
      </table>
    </div>
  );
}

function BudgetRow({ line, unit }: { line: BudgetLine; unit: string }) {
  const together = isCorrelation(line.input);
  const value = uncertainParts({ value: line.value, u: together ? null : line.u, unit });
  return (
    <tr className="border-b border-line" data-testid="budget-row">
      <th scope="row" className={`${cell} text-left`}>
        <Body>{inputWords(line.input)}</Body>
        <View>
          <Label className="font-mono">{line.input}</Label>
        </View>
      </th>
      <td className={right}>
        <Num className="whitespace-nowrap">{`${together ? 'r = ' : ''}${value.value}${value.uncertainty}${value.factor}`}</Num>
        <Label>{value.unit}</Label>
      </td>
      <td className={right}>
        <Num className="whitespace-nowrap">{together ? '–' : scientific(line.sensitivity)}</Num>
        <Label>
          {together ? '' : UNIT_OF_G}
          {unit === '' ? '' : ` per ${unitSign(unit)}`}
        </Label>
      </td>
      <td className={right}>
        <Num className="whitespace-nowrap">{scientific(line.contribution)}</Num>
        <Label>{UNIT_OF_G}</Label>
      </td>
      <td className={right}>
        <Num className="whitespace-nowrap">{formatPercent(line.share)}</Num>
      </td>
    </tr>
  );
}
