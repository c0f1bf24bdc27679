import { documentChanges, documentRows, rowsByGroup, withChange } from '@/components/rigs/document-rows';
import { quantityLine } from '@/components/rigs/quantity-words';
import { readRigText } from '@/components/rigs/read-rig-text';
import { demoRigNarrow, demoRigWide } from '@/shared/rig/demo-rigs';

const row = (path: string, document = demoRigWide) => documentRows(document).find((each) => each.path === path) ?? null;

test('every number of the document is a row, with a label of its own and no field name', () => {
  const rows = documentRows(demoRigWide);
  expect(rows.map(({ label }) => label).filter((label) => /[_.]|Deg$/.test(label))).toEqual([]);
  expect(rowsByGroup(rows).map(({ group }) => group)).toEqual(
    expect.arrayContaining(['Pendulum', 'Sources', 'Stations', 'Measured', 'Motion']),
  );
});

test.each([
  ['pendulum.arm', '75.000 ±\u202f0.050 mm'],
  ['pendulum.ballMass', '20.000 ±\u202f0.010 g'],
  ['sources.mass', '1.600\u202f00 ±\u202f0.000\u202f10 kg'],
  ['fibre.diameter', '25.00 ±\u202f0.30 µm'],
  ['fibre.shearModulus', '161.0 ±\u202f5.0 GPa'],
  ['stations.near', '20.180 ±\u202f0.050°'],
  ['sources.offset', '0.00 ±\u202f0.50 mm'],
  ['pendulum.travel_rad', '50 mrad'],
  ['motion.maxSpeed_deg_s', '6 °/s'],
  ['sources.shape', 'sphere'],
])('%s reads %s', (path, words) => {
  expect(quantityLine(row(path))).toBe(words);
});

test('keep-out arcs are said in words', () => {
  expect(quantityLine(row('motion.keepOut', demoRigNarrow))).toBe('-29° to 29°');
});

test('one change is one difference, and everything else is shared', () => {
  const after = withChange(demoRigWide, 'sources.orbit', { value: 0.1251, u: 0.0002 });
  expect(after.sources.orbit).toEqual({ value: 0.1251, u: 0.0002, unit: 'm' });
  expect(after.pendulum).toBe(demoRigWide.pendulum);
  expect(documentChanges(demoRigWide, after).map(({ path }) => path)).toEqual(['sources.orbit']);
  expect(documentChanges(demoRigWide, demoRigWide)).toEqual([]);
});

test('a quantity that is new or gone is a difference too', () => {
  const rest = { ...demoRigWide };
  delete rest.lever;
  expect(documentChanges(demoRigWide, rest).every(({ after }) => after === null)).toBe(true);
  expect(documentChanges(rest, demoRigWide).every(({ before }) => before === null)).toBe(true);
});

test('a text that is no JSON is refused with line and column', () => {
  expect(readRigText('{\n  "pendulum": {,}\n}').problems[0]?.message).toMatch(/^Line 2, column 16: /);
});

test('a rig with a wrong unit is refused at its place', () => {
  const text = JSON.stringify({ ...demoRigWide, pendulum: { ...demoRigWide.pendulum, arm: { value: 75, u: 0.05, unit: 'mm' } } });
  expect(readRigText(text).problems.map(({ path }) => path)).toEqual(['pendulum.arm.unit']);
});

test('an exported rig comes back as it was', () => {
  expect(readRigText(JSON.stringify(demoRigNarrow, null, 2)).document).toEqual(demoRigNarrow);
});
