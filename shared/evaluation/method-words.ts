import type { DriftResult } from './result';

/** What must be known beside the u of a difference of methods. */
export const sameSamplesWords =
  'What they observe counts as independent, though it comes of the same samples: noise that moves both alike makes this u too large.';

/** How the drift is taken off, in words. */
export const driftWords = (drift: DriftResult['drift']): string =>
  ({
    aba: 'windows of three dwells (ABA)',
    polynomial: 'a polynomial in time',
    gls: 'a zero that walks (generalised least squares)',
  })[drift];
