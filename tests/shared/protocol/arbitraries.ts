import * as fc from 'fast-check';
import type { ProtocolDocument, Step } from '@/shared/protocol/document';

/** Steps and documents that the wide demo rig can carry out, for property tests. */

const station = fc.constantFrom('near', 'far', 'clear', 'inline', 'nearBack', 'farBack');

const swingStep: fc.Arbitrary<Step> = fc.oneof(
  station.map((to): Step => ({ kind: 'swing', to })),
  fc.integer({ min: -170, max: 170 }).map((angle_deg): Step => ({ kind: 'swing', to: { angle_deg } })),
);

const standing: fc.Arbitrary<Step> = fc.oneof(
  fc.integer({ min: 1, max: 3000 }).map((for_s): Step => ({ kind: 'dwell', for_s })),
  fc.integer({ min: 1, max: 4 }).map((periods): Step => ({ kind: 'dwell', periods })),
  fc.integer({ min: 1, max: 3000 }).map((for_s): Step => ({ kind: 'settle', for_s })),
  fc.string({ minLength: 1, maxLength: 12 }).map((label): Step => ({ kind: 'mark', label })),
);

const leaf = fc.oneof(swingStep, standing);

const stepOfDepth = (depth: number): fc.Arbitrary<Step> =>
  depth === 0
    ? leaf
    : fc.oneof(
        { weight: 3, arbitrary: leaf },
        {
          weight: 1,
          arbitrary: fc
            .record({ times: fc.integer({ min: 1, max: 3 }), steps: fc.array(stepOfDepth(depth - 1), { minLength: 1, maxLength: 3 }) })
            .map(({ times, steps }): Step => ({ kind: 'repeat', times, steps })),
        },
      );

/** Up to three repeats deep, at most 10 steps on the outermost level. */
export const steps: fc.Arbitrary<Step[]> = fc.array(stepOfDepth(3), { minLength: 1, maxLength: 10 });

export const anyStep: fc.Arbitrary<Step> = stepOfDepth(2);

export const documents: fc.Arbitrary<ProtocolDocument> = fc
  .record({
    name: fc.string({ minLength: 1, maxLength: 20 }),
    steps,
    atEnd: fc.option(fc.constant({ station: 'clear' }), { nil: undefined }),
  })
  .map(({ name, steps: body, atEnd }): ProtocolDocument => ({
    formatVersion: 1,
    name,
    ...(atEnd === undefined ? {} : { atEnd }),
    steps: [{ kind: 'home' }, ...body],
  }));
