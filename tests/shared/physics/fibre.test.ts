import { fibreFacts, fibreWarnings, type FibreFacts } from '@/shared/physics/fibre';
import { demoRigWide } from '@/shared/rig/demo-rigs';
import type { RigDocument } from '@/shared/rig/document';
import { relativeDifference } from '../../support/check-data';

/** Check values of an independent implementation: 44 g on 25 µm of tungsten, 0.12 m long (physics.md A6, A7). */

const facts = (rig: RigDocument) => fibreFacts(rig) as FibreFacts;
const withFibre = (fibre: RigDocument['fibre']): RigDocument => ({ ...demoRigWide, fibre });

test('torsion constant of the wire, what tension adds, and the stress', () => {
  const found = facts(demoRigWide);
  expect(relativeDifference(found.kappa?.value ?? NaN, 5.145227226033e-8)).toBeLessThan(1e-9);
  expect(relativeDifference(found.tensionKappa ?? NaN, 2.809196614583e-10)).toBeLessThan(1e-9);
  expect(relativeDifference(found.periodKappa?.value ?? NaN, 5.211972603453e-8)).toBeLessThan(1e-6);
  // 2 u(d)/d of 0.05 mm in 75 mm for the balls' 97 % of I, u(m)/m of 10 mg in 20 g, 2 u(T)/T of 0.1 s in 420 s.
  const balls = 0.974;
  const expected = Math.hypot((2 * balls * 0.05) / 75, (balls * 0.01) / 20, 0.2 / 420);
  expect(relativeDifference((found.periodKappa?.u ?? NaN) / (found.periodKappa?.value ?? NaN), expected)).toBeLessThan(0.01);
  expect(relativeDifference(found.stressPa, 879029506.5289)).toBeLessThan(1e-9);
  // A micrometre in 25 is 16 % of κ.
  const { length, diameter, shearModulus } = demoRigWide.fibre ?? {};
  const loose = facts(
    withFibre({
      ...(length && { length }),
      ...(shearModulus && { shearModulus }),
      ...(diameter && { diameter: { ...diameter, u: 1e-6 } }),
    }),
  );
  expect((loose.kappa?.u ?? 0) / (loose.kappa?.value ?? 1)).toBeGreaterThan(0.159);
});

test('a rig that does not tell its fibre says nothing of it', () => {
  expect(fibreFacts(withFibre(undefined))).toBeNull();
  expect(facts(withFibre({ diameter: { value: 2.5e-5, u: 0, unit: 'm' } }))).toMatchObject({ kappa: null, tensionKappa: null });
});

test('the demo rig is sound; a wire too thin, and one that the period contradicts, are warned of', () => {
  expect(fibreWarnings(facts(demoRigWide))).toEqual([]);
  const thin = fibreWarnings({ ...facts(demoRigWide), stressPa: 1.8e9 });
  expect(thin).toEqual([expect.stringContaining('with 1.80 GPa, and no usual wire bears 2 times that') as string]);
  const other = fibreWarnings({ ...facts(demoRigWide), periodKappa: { value: 8e-8, u: 0 } });
  expect(other).toEqual([expect.stringContaining('u apart') as string]);
});
