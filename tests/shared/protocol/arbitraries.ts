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

const policy = fc.constantFrom('hold' as const, 'continue' as const, 'stop' as const);

/** Steps that end by what is measured or by a person. */
const conditional: fc.Arbitrary<Step> = fc.oneof(
  fc
    .record({ drift_urad_per_h: fc.integer({ min: 1, max: 500 }), atMost_s: fc.integer({ min: 600, max: 20_000 }), otherwise: policy })
    .map(({ drift_urad_per_h, ...rest }): Step => ({ kind: 'settle', calmWhen: { drift_urad_per_h, window_s: 600 }, ...rest })),
  fc
    .record({ below: fc.integer({ min: -5, max: 40 }), for_s: fc.integer({ min: 1, max: 600 }), otherwise: policy })
    .map(({ below, for_s, otherwise }): Step => ({
      ...{ kind: 'wait', until: { channel: 'box temperature', below, for_s } },
      ...{ atMost_s: 5400, otherwise },
    })),
  fc
    .constantFrom('hold' as const, 'stop' as const)
    .map((otherwise): Step => ({ kind: 'prompt', text: 'Hands clear', atMost_s: 600, otherwise })),
);

const leaf = fc.oneof({ weight: 3, arbitrary: swingStep }, { weight: 3, arbitrary: standing }, { weight: 1, arbitrary: conditional });

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
