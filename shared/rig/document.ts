import * as z from 'zod';

/**
 * The rig document (rig.json of the run archive): what the apparatus is, with the standard uncertainty of every
 * physical quantity. Field names are those of the archive format, units stand in each quantity.
 */

const quantity = <U extends string>(unit: U) =>
  z.strictObject({
    value: z.number(),
    /** Standard uncertainty (k = 1), in the unit of the value. */
    u: z.number().nonnegative(),
    unit: z.literal(unit),
    /** Degrees of freedom of `u`; absent means infinite. */
    nu: z.number().positive().optional(),
    distribution: z.enum(['normal', 'rectangular']).optional(),
    /** Quantities of one group share their error fully. */
    group: z.string().optional(),
    /** Id of the measurement record the value comes from. */
    record: z.string().optional(),
  });

export type Quantity = {
  value: number;
  u: number;
  unit: string;
  nu?: number | undefined;
  distribution?: 'normal' | 'rectangular' | undefined;
  group?: string | undefined;
  record?: string | undefined;
};

const pendulumSchema = z.strictObject({
  arm: quantity('m'),
  ballMass: quantity('kg'),
  ballRadius: quantity('m'),
  beamMass: quantity('kg'),
  beamLength: quantity('m'),
  extraInertia: quantity('kg.m2').optional(),
  balls: z.literal(2),
  travel_rad: z.number().positive().optional(),
});

const extraPartSchema = z.strictObject({
  label: z.string(),
  mass: quantity('kg'),
  orbit: quantity('m'),
  angle: quantity('deg'),
  offset: quantity('m'),
});

const sourcesSchema = z
  .strictObject({
    shape: z.enum(['sphere', 'cylinder', 'none']),
    count: z.literal(2).optional(),
    mass: quantity('kg').optional(),
    radius: quantity('m').optional(),
    height: quantity('m').optional(),
    orbit: quantity('m').optional(),
    offset: quantity('m').optional(),
    extra: z.array(extraPartSchema).optional(),
  })
  .superRefine((sources, context) => {
    if (sources.shape === 'none') return;
    const needed = sources.shape === 'cylinder' ? (['mass', 'radius', 'height', 'orbit'] as const) : (['mass', 'radius', 'orbit'] as const);
    for (const key of needed) {
      if (sources[key] === undefined) {
        context.addIssue({ code: 'custom', path: [key], message: `sources.${key} is needed for shape ${sources.shape}` });
      }
    }
  });

const stationSchema = quantity('deg').extend({ approach: z.enum(['ccw', 'cw']).optional() });

const motionSchema = z
  .strictObject({
    stepsPerDegree: z.number().positive(),
    minDeg: z.number(),
    maxDeg: z.number(),
    maxSpeed_deg_s: z.number().positive(),
    maxAcceleration_deg_s2: z.number().positive(),
    homeDeg: z.number(),
    homeSpeed_deg_s: z.number().positive().optional(),
    backlash_deg: z.number().nonnegative().optional(),
    turnsLimit: z.number().nonnegative().optional(),
    keepOut: z.array(z.tuple([z.number(), z.number()])).optional(),
    safeWhenFree: z.boolean().optional(),
  })
  .superRefine((motion, context) => {
    if (motion.minDeg >= motion.maxDeg)
      context.addIssue({ code: 'custom', path: ['minDeg'], message: 'motion.minDeg must be below motion.maxDeg' });
    motion.keepOut?.forEach(([from, to], index) => {
      if (from >= to)
        context.addIssue({ code: 'custom', path: ['keepOut', index], message: 'a keep-out arc runs from a smaller to a greater angle' });
    });
  });

const noiseSchema = z.strictObject({
  readout_rad: z.number().nonnegative().optional(),
  walk_rad_per_sqrt_min: z.number().nonnegative().optional(),
  drift_rad_per_h: z.number().optional(),
  bursts_per_h: z.number().nonnegative().optional(),
  burst_rad: z.number().nonnegative().optional(),
  burst_s: z.number().nonnegative().optional(),
  temperature_K: z.number().nonnegative().optional(),
});

export const rigDocumentSchema = z.strictObject({
  pendulum: pendulumSchema,
  readout: z.strictObject({ range_rad: z.number().positive().optional() }).optional(),
  sources: sourcesSchema,
  axis: z.strictObject({ offset: quantity('m') }).optional(),
  stations: z.record(z.string(), stationSchema),
  lever: z
    .strictObject({
      distance: quantity('m'),
      fold: z.number().positive(),
      sense: z.union([z.literal(1), z.literal(-1)]),
      zero: quantity('m').optional(),
    })
    .optional(),
  fibre: z
    .strictObject({ length: quantity('m').optional(), diameter: quantity('m').optional(), shearModulus: quantity('Pa').optional() })
    .optional(),
  measured: z.strictObject({ period_s: quantity('s').optional(), decayTime_s: quantity('s').optional() }).optional(),
  motion: motionSchema.optional(),
  noise: noiseSchema.optional(),
});

export type RigDocument = z.infer<typeof rigDocumentSchema>;
export type RigMotion = NonNullable<RigDocument['motion']>;
export type StationName = string;
