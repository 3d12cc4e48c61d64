import { z } from 'zod/v4';

import type { CorrelationModel } from '#core/correlation/model.ts';

const km = (what: string) =>
  z.number().positive(`${what} must be a positive distance in km.`).max(20_000, `${what} may be at most 20,000 km.`);

/** Exactly one of `daleyKm` and `scaleKm`; the other is computed from it and `steps`. */
export const correlationSchema = z
  .strictObject({
    kind: z.enum(['scalar', 'vector']),
    daleyKm: km('The Daley length').optional(),
    scaleKm: km('The diffusion scale').optional(),
    steps: z.int().min(2, 'At least 2 implicit steps are needed.').max(20, 'At most 20 implicit steps.'),
    mass: z.enum(['consistent', 'lumped']).default('consistent'),
    normalisation: z.enum(['exact', 'theory']).default('exact'),
    tolerance: z.number().min(1e-6, 'The tolerance must be at least 0.0001 %.').max(0.5, 'The tolerance may be at most 50 %.').default(0.01),
    rotationalShare: z.number().min(0).max(1).optional(),
    correlatedShare: z.number().min(0).max(1).optional(),
    sphereRadiusKm: z.number().min(1).max(1_000_000).default(6371),
  })
  .check((ctx) => {
    const c = ctx.value;
    const fail = (path: string, message: string) =>
      ctx.issues.push({ code: 'custom', input: c, path: [path], message });
    if ((c.daleyKm === undefined) === (c.scaleKm === undefined))
      fail('daleyKm', 'Give either the Daley length or the diffusion scale, not both.');
    if (c.daleyKm !== undefined && c.steps < 3)
      fail('steps', 'With 2 steps the Daley length is zero: give the diffusion scale instead, or at least 3 steps.');
    if (c.kind === 'vector' && c.steps < 3) fail('steps', 'A two-component model needs at least 3 steps.');
    if (c.kind === 'scalar' && c.rotationalShare !== undefined)
      fail('rotationalShare', 'Only a two-component model has a rotational share.');
  });

export type Correlation = z.infer<typeof correlationSchema>;
const _sameAsCore = (c: Correlation): CorrelationModel => c;
void _sameAsCore;
