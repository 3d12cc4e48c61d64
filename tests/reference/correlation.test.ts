import { describe, expect, it } from 'vitest';

import { besselI, besselK01 } from '#core/correlation/bessel.ts';
import { bufferForTolerance, cornerExcess, straightSideExcess } from '#core/correlation/boundary-effect.ts';
import { straightComponentExcess } from '#core/correlation/component-excess.ts';
import { straightCorrelationChange } from '#core/correlation/correlation-change.ts';
import { discExcess } from '#core/correlation/disc.ts';
import { maternCorrelation, maternDerivatives } from '#core/correlation/matern.ts';
import type { CorrelationModel } from '#core/correlation/model.ts';
import { resolveScale, theoreticalNormalisation } from '#core/correlation/scale.ts';
import { referenceValues } from './reference-values.ts';

const model = (over: Partial<CorrelationModel>): CorrelationModel => ({
  kind: 'scalar', scaleKm: 1, steps: 4, mass: 'consistent', normalisation: 'theory', tolerance: 0.01, sphereRadiusKm: 6371, ...over,
});
const relative = (value: number, exact: number) => Math.abs(value - exact) / Math.abs(exact);

describe('Bessel functions', () => {
  // Abramowitz & Stegun 1964, tables 9.8 and 9.11, continued with mpmath at 50 digits
  it.each([
    [0.1, 2.427069024702017, 9.853844780870606],
    [1, 0.42102443824070834, 0.6019072301972346],
    [2, 0.11389387274953344, 0.13986588181652243],
    [5, 0.003691098334042594, 0.004044613445452164],
  ])('gives K0 and K1 at %d', (x, k0, k1) => {
    const k = besselK01(x);
    expect(relative(k.k0, k0)).toBeLessThan(1e-15 * 3);
    expect(relative(k.k1, k1)).toBeLessThan(1e-15 * 3);
  });

  // DLMF 10.28.2: I_n K_(n+1) + I_(n+1) K_n = 1/x, which joins both functions on every branch
  it('keeps the Wronskian over the branches of the algorithms', () => {
    for (let x = 0.05; x < 60; x *= 1.13) {
      const { k0, k1 } = besselK01(x);
      expect(Math.abs(x * (besselI(0, x) * k1 + besselI(1, x) * k0) - 1)).toBeLessThan(2e-14);
    }
  });
});

describe('Matern correlation', () => {
  const values = referenceValues('matern');

  it('agrees with the 50-digit closed form to 1e-12, derivatives included', () => {
    for (const c of values.cases) {
      const v = maternDerivatives(c.m, c.r_over_l);
      expect(relative(v.value, c.c)).toBeLessThan(values.tolerance);
      expect(relative(maternCorrelation(c.m, c.r_over_l), c.c)).toBeLessThan(values.tolerance);
      expect(Math.abs(v.first - c.l_dc_dr)).toBeLessThanOrEqual(values.tolerance * Math.abs(c.l_dc_dr));
      if (c.l2_d2c_dr2 !== null) expect(relative(v.second, c.l2_d2c_dr2)).toBeLessThan(values.tolerance);
      else expect(v.second).toBe(-Infinity);
    }
  });

  it('gives the Daley length and the normalisation factor of each number of steps', () => {
    for (const s of values.scales) {
      const scale = resolveScale({ scaleKm: 2, steps: s.m });
      if (s.D_over_l === null) expect(scale.daleyKm).toBeNull();
      else expect(relative(scale.daleyKm as number, 2 * s.D_over_l)).toBeLessThan(1e-15);
      expect(relative(theoreticalNormalisation(s.m, 2), 4 * s.gamma2_over_l2)).toBeLessThan(1e-15 * 4);
    }
  });

  it('refuses a Daley length with two steps', () => {
    expect(() => resolveScale({ daleyKm: 100, steps: 2 })).toThrowError(/Daley length is zero/);
  });
});

describe('boundary effect in closed form', () => {
  it('meets the half-plane values of the method of images', () => {
    for (const c of referenceValues('boundary').half_plane) {
      if (c.d_over_l === 0) continue;
      expect(relative(1 + straightSideExcess(model({ steps: c.m }), c.d_over_l).variance, c.varianceRatio)).toBeLessThan(1e-12);
    }
  });

  it('meets the disc and the rounded corners, derivative in s included', () => {
    const values = referenceValues('disc');
    for (const c of values.cases) {
      expect(relative(discExcess(c.m, c.radius_over_l), c.centreVarianceExcess)).toBeLessThan(values.tolerance);
      for (const [turning, excess] of Object.entries(c.roundedCornerExcess))
        expect(relative(cornerExcess(model({ steps: c.m }), c.radius_over_l, (Number(turning) * Math.PI) / 180).variance, excess as number)).toBeLessThan(values.tolerance);
    }
  });

  it('meets the buffer table', () => {
    const values = referenceValues('buffer');
    for (const c of values.cases)
      expect(Math.abs(bufferForTolerance(model({ steps: c.m, tolerance: c.level })) - c.d_over_l)).toBeLessThan(values.tolerance);
  });

  // figures of an independent prototype (images, dense search over partners)
  it('gives the correlation change that remains under exact normalisation', () => {
    expect(straightCorrelationChange(4, 4.306182759973597)).toBeCloseTo(0.0027, 4);
    expect(bufferForTolerance(model({ steps: 4, normalisation: 'exact' })) / 2).toBeCloseTo(1.61, 2);
    expect(bufferForTolerance(model({ steps: 10, normalisation: 'exact' })) / 4).toBeCloseTo(1.32, 2);
  });

  it('finds no partner in the half plane with a larger correlation change', () => {
    for (const [m, d] of [[3, 2], [4, 4.3], [10, 5.3]] as const) {
      let most = 0;
      for (let across = 0; across < 12; across += 0.25)
        for (let along = 0; along < 12; along += 0.25) {
          const r = Math.hypot(across, along);
          const c = maternCorrelation(m, r);
          const here = (c + maternCorrelation(m, Math.hypot(along, 2 * d + across))) / Math.sqrt((1 + maternCorrelation(m, 2 * d)) * (1 + maternCorrelation(m, 2 * (d + across))));
          most = Math.max(most, Math.abs(here - c));
        }
      expect(straightCorrelationChange(m, d)).toBeGreaterThan(most * 0.999);
      expect(straightCorrelationChange(m, d)).toBeLessThan(most * 1.01);
    }
  });

  // D² c''(2d) by images; buffers from an independent prototype
  it('changes the components of a vector by the image of their derivatives', () => {
    const at = straightComponentExcess(4, 4.306182759973597, 0);
    expect(at.across).toBeCloseTo(0.022, 3);
    expect(bufferForTolerance(model({ steps: 4, kind: 'vector' })) / 2).toBeCloseTo(2.43, 2);
    expect(bufferForTolerance(model({ steps: 10, kind: 'vector' })) / 4).toBeCloseTo(2.09, 2);
    const swapped = straightComponentExcess(4, 3, 1);
    expect(swapped.along).toBe(straightComponentExcess(4, 3, 0).across);
  });
});
