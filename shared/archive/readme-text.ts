import type { DescribedRun } from './describe-archive';

/** What somebody who has nothing but the archive needs to find G again. */

export const readmeFile = 'README.md';

/** Text of `README.md`: what the files are, and how G follows from them in seven steps. */
export function readmeText({ title, runId, evaluation }: DescribedRun): string {
  const found =
    evaluation?.result == null
      ? 'This archive holds no frozen evaluation: what it gives is for you to find.'
      : `The frozen evaluation of ${evaluation.at.slice(0, 10)} (evaluation.json) found G = ${evaluation.result}; in brackets the standard uncertainty.`;
  return `# ${title.replaceAll(/\s+/g, ' ')}

Run ${runId} of a torsion balance. ${found}

## Files

| file | what |
|---|---|
| datapackage.json | all files with SHA-256, and the unit and role of each channel (Frictionless Data Package) |
| rig.json | the apparatus: each quantity with its standard uncertainty \`u\` and its unit |
| protocol.json | what was to be done, and how it was to be evaluated, decided before |
| steps.csv | what was done: start and end of each step in UTC with u, turntable angles in degrees |
| events.jsonl | the log as a chain: \`hash\` is the SHA-256 of the canonical JSON (RFC 8785) of a line without \`hash\`, \`prev\` that of the line before |
| channels/*.csv | what was read, in UTC; where datapackage.json has a \`calibration\` of the channel, the value is offset + slope · reading |
| frames/ | what cameras saw at both ends of swings and at marks, listed in frames/frames.csv; where there are any |
| exclusions.csv, notes.csv, evaluation.json | stretches left out, what was written to steps, the frozen evaluation; where there are any |

## G again, by hand

1. **Dwells.** Take the rows \`dwell\` and \`ring-down\` of steps.csv that are \`done\` and not marked \`good\` = false, and the samples of the channel of role \`deflection\` in each, a second
   away from its ends, without the stretches of exclusions.csv. A spot position x gives the angle by x = x0 + sense · distance · tan(fold · θ).
2. **Fit.** θ(t) = c + d (t − middle) + exp(−γ t) (A cos ωt + B sin ωt), with ω and γ common to all, the rest for each by least squares. It is robust (Huber, then biweight) against bursts.
3. **Near minus far.** Near and far are the stations of rig.json, or half a turn away. Mean over all three neighbours a, b, c in time of ± (a − 2b + c)/2: a steady drift cancels.
4. **Torque.** For each source (mass M, at orbit R, h above the balls) at the angle ψ from the arm, and balls m at the distance d: with A∓ = d² + R² + h² ∓ 2dR cos ψ
   the two balls and two sources give 2 G m M d R sin ψ (A₋^(−3/2) − A₊^(−3/2)). A beam of mass m_b and half length b adds, with q = R² + h², A± = b² ± 2Rb cos ψ + q, W = √(A₊A₋),
   8 G M m_b b² R² sin ψ cos ψ / [(√A₊ + √A₋) W (W + q − b²)]. Cylinders need their field integrated. ψ is the turntable's angle less the pendulum's.
5. **Torsion constant.** I = 2m (d² + ⅖ r²) + m_b (2b)²/12 + extra inertia. In the dwells I (ω² + γ²) is κ + G g′(ψ), with g = torque/G; sources away it is κ itself: the weighted mean of both, where
   rig.json has \`measured\`.
6. **G.** Solve κ (θ_near − θ_far) = G [g(φ_near − θ_near) − g(φ_far − θ_far)], each θ counted from where the fibre alone would hold the arm.
7. **What remains.** The torque is no straight line over a swing, so step 2 is biased by some 1e-5 of G: integrate I θ̈ = −c θ̇ − κ θ + G g(φ − θ) from the start of each dwell with the G found, put it
   through steps 2 to 6, and take off what comes out too great.

Uncertainties: scatter of the dwells for step 3, u of rig.json for all else, by the derivatives of G (JCGM 100) or by drawing (JCGM 101).
`;
}
