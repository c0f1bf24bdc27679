import * as fc from 'fast-check';
import { compareDocuments } from '@/shared/protocol/compare';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';
import { insertStep, removeStep, replaceStep } from '@/shared/protocol/edit';
import { walkSteps } from '@/shared/protocol/step-path';
import { documents } from './arbitraries';

const swing = (to: string): Step => ({ kind: 'swing', to });
const dwell = (for_s: number): Step => ({ kind: 'dwell', for_s });
const document = (steps: Step[], more: Partial<ProtocolDocument> = {}): ProtocolDocument => ({
  formatVersion: 1,
  name: 'Test',
  steps,
  ...more,
});

test('a document does not differ from itself, whatever the order of its fields', () => {
  fc.assert(
    fc.property(documents, (each) => {
      const { steps, ...rest } = each;
      expect(
        compareDocuments(each, { steps: steps.map((step) => Object.fromEntries(Object.entries(step).reverse()) as Step), ...rest }),
      ).toEqual([]);
    }),
  );
});

test('tells the field of a step with its value before and after', () => {
  expect(compareDocuments(document([swing('near'), dwell(620)]), document([swing('near'), dwell(830)]))).toEqual([
    { kind: 'changed', pathBefore: '2.dwell', pathAfter: '2.dwell', field: 'for_s', before: 620, after: 830 },
  ]);
});

test('a length given another way is one field gone and one come', () => {
  expect(compareDocuments(document([dwell(620)]), document([{ kind: 'dwell', beat_periods: 2 }]))).toEqual([
    { kind: 'removed', pathBefore: '1.dwell', pathAfter: '1.dwell', field: 'for_s', before: 620, after: undefined },
    { kind: 'added', pathBefore: '1.dwell', pathAfter: '1.dwell', field: 'beat_periods', before: undefined, after: 2 },
  ]);
});

test('a step put in before others leaves them alone', () => {
  expect(
    compareDocuments(
      document([swing('near'), dwell(830), swing('far')]),
      document([swing('near'), { kind: 'settle', for_s: 60 }, dwell(830), swing('far')]),
    ),
  ).toEqual([
    { kind: 'added', pathBefore: null, pathAfter: '2.settle', field: '', before: undefined, after: { kind: 'settle', for_s: 60 } },
  ]);
});

test('looks into repeats', () => {
  const night = (times: number, for_s: number) => document([{ kind: 'repeat', times, steps: [swing('far'), dwell(for_s)] }]);
  expect(
    compareDocuments(night(6, 620), night(16, 830)).map(({ pathAfter, field, before, after }) => [pathAfter, field, before, after]),
  ).toEqual([
    ['1.repeat', 'times', 6, 16],
    ['1.repeat.2.dwell', 'for_s', 620, 830],
  ]);
});

test('fields of the document come first', () => {
  const differences = compareDocuments(
    document([dwell(1)], { onInterruption: 'hold' }),
    document([], { onInterruption: 'resume', notes: 'new' }),
  );
  expect(differences.map(({ kind, field, pathBefore }) => [kind, field, pathBefore])).toEqual([
    ['added', 'notes', null],
    ['changed', 'onInterruption', null],
    ['removed', '', '1.dwell'],
  ]);
});

test('one edit gives differences, and the other way round as many', () => {
  fc.assert(
    fc.property(documents, fc.nat(), (each, which) => {
      const places = [...walkSteps(each.steps)];
      const place = places[which % places.length]?.positions ?? [1];
      const news: Step = { kind: 'mark', label: 'quite another label than any' };
      for (const edited of [insertStep(each, place, news), removeStep(each, place), replaceStep(each, place, news)]) {
        const there = compareDocuments(each, edited.document);
        const back = compareDocuments(edited.document, each);
        expect(there.length).toBeGreaterThan(0);
        expect(back.length).toBe(there.length);
      }
    }),
  );
});

test('very long lists are compared in reasonable time', () => {
  const long = (offset: number) => document(Array.from({ length: 5000 }, (_, index) => dwell(index * 2 + offset + 1)));
  expect(compareDocuments(long(0), long(1))).toHaveLength(5000);
});
