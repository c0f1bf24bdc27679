import { MotorSoak } from '@/server/engine/motor-soak';

const hour = 3_600_000;
const told = (bootId: string, driversOn: boolean) => ({ bootId, driversOn });

test('the current counts from when it came on, through silence of the line, until it goes off or the controller restarts', () => {
  const soak = new MotorSoak();
  expect(soak.sinceUtcMs('rig')).toBeNull();
  soak.note('rig', told('a', false), 0);
  expect(soak.sinceUtcMs('rig')).toBeNull();
  soak.note('rig', told('a', true), 1 * hour);
  soak.note('rig', null, 2 * hour);
  soak.note('rig', told('a', true), 3 * hour);
  expect(soak.sinceUtcMs('rig')).toBe(1 * hour);
  soak.note('rig', told('b', true), 4 * hour);
  expect(soak.sinceUtcMs('rig')).toBe(4 * hour);
  soak.note('rig', told('b', false), 5 * hour);
  expect(soak.sinceUtcMs('rig')).toBeNull();
});
