/** What must be known beside the u of a difference of methods. */
export const sameSamplesWords =
  'What they observe counts as independent, though it comes of the same samples: noise that moves both alike makes this u too large.';
