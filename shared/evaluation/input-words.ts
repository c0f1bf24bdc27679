import type { RigDocument } from '../rig/document';

const inWords: Record<string, string> = {
  reversal_rad: 'near − far, scatter of dwells',
  modulation_rad: 'size of the modulation, scatter of turns',
  period_s: 'period',
  decayTime_s: 'decay time',
  'sources.orbit': 'orbit of the sources',
  'sources.mass': 'mass of a source',
  'sources.radius': 'radius of a source',
  'sources.offset': 'height of the sources',
  'pendulum.arm': 'arm of the pendulum',
  'pendulum.ballMass': 'mass of a ball',
  'pendulum.ballRadius': 'radius of a ball',
  'pendulum.beamMass': 'mass of the beam',
  'pendulum.beamLength': 'length of the beam',
  'pendulum.extraInertia': 'extra inertia',
  'lever.distance': 'mirror to scale',
  'lever.zero': 'zero of the scale',
  'calibration.slope': 'calibration of the channel, slope',
  'axis.offset': 'turntable axis to fibre',
  'stations.near': 'angle of near',
  'stations.far': 'angle of far',
  'measured.period_s': 'period, sources away',
  'measured.decayTime_s': 'decay time, sources away',
  correlation: 'near − far, period and decay time err together',
  'correlation.reversal_rad.period_s': 'near − far and period err together',
  'correlation.reversal_rad.decayTime_s': 'near − far and decay time err together',
  'correlation.period_s.decayTime_s': 'period and decay time err together',
};

/** What an input of the budget is called for people; the path itself where there is no word for it. */
export const inputWords = (input: string): string => inWords[input] ?? input;

const knownUnits: Record<string, string> = { reversal_rad: 'rad', modulation_rad: 'rad', period_s: 's', decayTime_s: 's' };

/** A line of the budget that holds no input but how two of them err together: its value is a correlation coefficient, without u and sensitivity. */
export const isCorrelation = (input: string): boolean => input.startsWith('correlation.');

/** Unit of a budget line: that of the rig's quantity at the path. */
export function unitOfInput(input: string, rig: RigDocument | null): string {
  const known = knownUnits[input];
  if (known !== undefined) return known;
  let at: unknown = rig;
  for (const name of input.split(/[.[\]]/).filter(Boolean))
    at = typeof at === 'object' && at !== null ? (at as Record<string, unknown>)[name] : undefined;
  return typeof at === 'object' && at !== null && 'unit' in at && typeof at.unit === 'string' ? at.unit : '';
}
