import * as z from 'zod';

/**
 * The protocol document, format 1. The schema holds every step kind of the format; which of them this version of
 * Evenfall runs is decided in `support.ts`, so that a document written for a later version still parses and is
 * refused with the code `not-yet` instead of being misread.
 */

const label = { label: z.string().max(200).optional() };
const positive = z.number().positive();
const localTime = z.string().regex(/^([01]\d|2[0-3]):[0-5]\d$/, 'a local time is written HH:MM, for example 22:00');

export const targetSchema = z.union([z.string().min(1), z.strictObject({ angle_deg: z.number() })]);
export type SwingTarget = z.infer<typeof targetSchema>;

const homeSchema = z.strictObject({ kind: z.literal('home'), ...label });

const swingSchema = z.strictObject({
  kind: z.literal('swing'),
  to: targetSchema,
  profile: z.enum(['plain', 'shaped']).optional(),
  speed_deg_s: positive.optional(),
  acceleration_deg_s2: positive.optional(),
  ...label,
});

const exactlyOne = (keys: readonly string[]) => (step: Record<string, unknown>, context: z.RefinementCtx) => {
  const given = keys.filter((key) => step[key] !== undefined);
  if (given.length !== 1)
    context.addIssue({
      code: 'custom',
      message: `exactly one of ${keys.join(', ')} is needed, got ${given.length === 0 ? 'none' : given.join(' and ')}`,
    });
};

const dwellSchema = z
  .strictObject({
    kind: z.literal('dwell'),
    for_s: positive.optional(),
    periods: positive.optional(),
    beat_periods: positive.optional(),
    ...label,
  })
  .superRefine(exactlyOne(['for_s', 'periods', 'beat_periods']));

const kickSchema = z.strictObject({
  kind: z.literal('kick'),
  amplitude_urad: positive,
  to: targetSchema.optional(),
  periods: positive.optional(),
  ...label,
});

const otherwise = z.enum(['hold', 'continue', 'stop']);

const settleSchema = z
  .strictObject({
    kind: z.literal('settle'),
    for_s: positive.optional(),
    calmWhen: z
      .strictObject({ amplitude_urad: positive.optional(), drift_urad_per_h: positive.optional(), window_s: positive })
      .refine(
        (calm) => calm.amplitude_urad !== undefined || calm.drift_urad_per_h !== undefined,
        'amplitude_urad or drift_urad_per_h is needed',
      )
      .optional(),
    atMost_s: positive.optional(),
    otherwise: otherwise.optional(),
    ...label,
  })
  .superRefine(exactlyOne(['for_s', 'calmWhen']));

const untilTimeSchema = z.strictObject({ localTime, ifPast: z.enum(['continue', 'hold', 'next day']).optional() });
const untilChannelSchema = z
  .strictObject({
    channel: z.string().min(1),
    below: z.number().optional(),
    slopeBelow_per_h: positive.optional(),
    for_s: positive.optional(),
  })
  .superRefine(exactlyOne(['below', 'slopeBelow_per_h']));

const waitSchema = z.strictObject({
  kind: z.literal('wait'),
  until: z.union([untilTimeSchema, untilChannelSchema]),
  atMost_s: positive.optional(),
  otherwise: otherwise.optional(),
  ...label,
});

const bound = z.number().positive().nullable().optional();
const proofSchema = z.strictObject({
  kind: z.literal('proof'),
  sign: z.boolean().nullable().optional(),
  size: bound,
  period: bound,
  residual: bound,
  edge_deg: bound,
  otherwise: otherwise.optional(),
  ...label,
});

const markSchema = z.strictObject({ kind: z.literal('mark'), label: z.string().min(1).max(200), frame: z.boolean().optional() });
const promptSchema = z.strictObject({
  kind: z.literal('prompt'),
  text: z.string().min(1),
  atMost_s: positive.optional(),
  otherwise: z.enum(['hold', 'stop']).optional(),
  ...label,
});
const rotateSchema = z.strictObject({
  kind: z.literal('rotate'),
  period_s: positive,
  turns: z
    .number()
    .int()
    .refine((turns) => turns !== 0, 'at least one turn'),
  ...label,
});

const count = z.number().int().positive();

const untilRepeatSchema = z.union([z.strictObject({ localTime }), z.strictObject({ relativeStatisticalU: positive })]);

/** `steps` refers back to the step schema, so the repeat and the union are declared through a getter. */
const repeatSchema = z
  .strictObject({
    kind: z.literal('repeat'),
    times: count.optional(),
    until: untilRepeatSchema.optional(),
    atLeast: count.optional(),
    atMost: count.optional(),
    counting: z.enum(['all', 'good']).optional(),
    order: z.enum(['as written', 'shuffled']).optional(),
    get steps(): z.ZodArray<typeof stepSchema> {
      return z.array(stepSchema);
    },
    ...label,
  })
  .superRefine(exactlyOne(['times', 'until']));

export const stepSchema: z.ZodType<Step> = z.lazy(() =>
  z.discriminatedUnion('kind', [
    homeSchema,
    swingSchema,
    dwellSchema,
    kickSchema,
    settleSchema,
    waitSchema,
    proofSchema,
    markSchema,
    promptSchema,
    rotateSchema,
    repeatSchema,
  ]),
) as unknown as z.ZodType<Step>;

/** The fields that each step kind takes, `kind` first. */
export const stepFields: Record<StepKind, string[]> = {
  home: Object.keys(homeSchema.shape),
  swing: Object.keys(swingSchema.shape),
  dwell: Object.keys(dwellSchema.shape),
  kick: Object.keys(kickSchema.shape),
  settle: Object.keys(settleSchema.shape),
  wait: Object.keys(waitSchema.shape),
  proof: Object.keys(proofSchema.shape),
  mark: Object.keys(markSchema.shape),
  prompt: Object.keys(promptSchema.shape),
  rotate: Object.keys(rotateSchema.shape),
  repeat: Object.keys(repeatSchema.shape),
};

export type HomeStep = z.infer<typeof homeSchema>;
export type SwingStep = z.infer<typeof swingSchema>;
export type DwellStep = z.infer<typeof dwellSchema>;
export type KickStep = z.infer<typeof kickSchema>;
export type SettleStep = z.infer<typeof settleSchema>;
export type WaitStep = z.infer<typeof waitSchema>;
export type ProofStep = z.infer<typeof proofSchema>;
export type MarkStep = z.infer<typeof markSchema>;
export type PromptStep = z.infer<typeof promptSchema>;
export type RotateStep = z.infer<typeof rotateSchema>;
export type RepeatStep = {
  kind: 'repeat';
  times?: number | undefined;
  until?: z.infer<typeof untilRepeatSchema> | undefined;
  atLeast?: number | undefined;
  atMost?: number | undefined;
  counting?: 'all' | 'good' | undefined;
  order?: 'as written' | 'shuffled' | undefined;
  steps: Step[];
  label?: string | undefined;
};
export type Step =
  HomeStep | SwingStep | DwellStep | KickStep | SettleStep | WaitStep | ProofStep | MarkStep | PromptStep | RotateStep | RepeatStep;
export type StepKind = Step['kind'];

const goodWhenSchema = z.strictObject({
  residual_urad: positive.optional(),
  channels: z
    .array(
      z.strictObject({
        channel: z.string().min(1),
        below: z.number().optional(),
        above: z.number().optional(),
        slopeBelow_per_h: positive.optional(),
      }),
    )
    .optional(),
});

export const registeredEvaluationSchema = z.strictObject({
  method: z.enum(['equilibrium', 'period', 'acceleration', 'modulation']).optional(),
  drift: z.enum(['aba', 'polynomial', 'gls']).optional(),
  order: z.number().int().min(0).max(6).optional(),
  channel: z.string().min(1).optional(),
});

export const interruptionPolicySchema = z.enum(['hold', 'resume', 'stop']);
export type InterruptionPolicy = z.infer<typeof interruptionPolicySchema>;

export const protocolDocumentSchema = z.strictObject({
  formatVersion: z.literal(1),
  name: z.string().min(1).max(120),
  notes: z.string().max(20000).optional(),
  onInterruption: interruptionPolicySchema.optional(),
  atEnd: z.strictObject({ station: z.string().min(1).optional(), drivers: z.enum(['keep', 'release']).optional() }).optional(),
  goodWhen: goodWhenSchema.optional(),
  evaluation: registeredEvaluationSchema.optional(),
  /** May be empty in a draft; `check` refuses that. */
  steps: z.array(stepSchema),
});

/** The fields of the document itself. */
export const documentFields: string[] = Object.keys(protocolDocumentSchema.shape);

export type ProtocolDocument = z.infer<typeof protocolDocumentSchema>;
