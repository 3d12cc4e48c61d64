/** The domains, numbers of steps and buffers on which the prediction meets finite elements; lengths in scales. */
import type { CorrelationModel } from '#core/correlation/model.ts';
import { predictBoundaryEffect } from '#core/correlation/boundary-effect.ts';
import { distanceToBoundary } from '#core/correlation/boundary-distance.ts';
import { bandedOperator } from './banded-operator.ts';
import type { Domain } from './boundary-domains.ts';
import { holeDomain, reentrantDomain, starDomain, wallReach } from './boundary-domains.ts';

export const modelOf = (steps: number): CorrelationModel => ({
  kind: 'scalar', scaleKm: 1, steps, mass: 'consistent', normalisation: 'theory', tolerance: 0.01, sphereRadiusKm: 6371,
});

/** Unit of the buffers: D, or 1.5 l for two steps, where D is zero. */
export const unitOf = (steps: number): number => (steps === 2 ? 1.5 : Math.sqrt(2 * steps - 4));

const RINGS = 36;
const SECTORS = 72;

/** Makes the domain with a buffer of `b` for a unit of length `u`. */
export const DOMAINS: Record<string, (u: number, b: number) => Domain> = {
  'disc, centre': (u, b) => starDomain(() => b, () => 1 / b, RINGS, SECTORS, 3 * u),
  'disc of 1.3 buffers, off centre': (u, b) => offCentre(u, b, 1.3),
  'disc of 2 buffers, off centre': (u, b) => offCentre(u, b, 2),
  'disc of 4 buffers, off centre': (u, b) => offCentre(u, b, 4),
  strip: (u, b) => starDomain(wallReach([{ angle: Math.PI / 2, distance: b }, { angle: -Math.PI / 2, distance: 1.2 * b }], b + 5 * u), () => 0, RINGS, SECTORS, 3 * u),
  'square corner of 90 degrees': (u, b) => starDomain(wallReach([{ angle: Math.PI / 4, distance: b }, { angle: -Math.PI / 4, distance: b }], b + 5 * u), () => 0, RINGS, SECTORS, 3 * u),
  'square corner of 120 degrees': (u, b) => starDomain(wallReach([{ angle: Math.PI / 6, distance: b }, { angle: -Math.PI / 6, distance: b }], b + 5 * u), () => 0, RINGS, SECTORS, 3 * u),
  ...Object.fromEntries([30, 60, 90, 120, 150].map((angle) => [`rounded corner of ${angle} degrees`, (u: number, b: number) => roundedCorner(u, b, angle)])),
  'hole of 0.3 D': (u, b) => hole(u, b, 0.3),
  'hole of 1 D': (u, b) => hole(u, b, 1),
  'hole of 2 D': (u, b) => hole(u, b, 2),
  're-entrant corner, on the bisector': (u, b) => reentrantDomain(-b, -b, u / 8, b + 2.5 * u),
  're-entrant corner, beside a side': (u, b) => reentrantDomain(-b, 0.5 * b, u / 8, b + 2.5 * u),
  're-entrant corner, in the shadow': (u, b) => reentrantDomain(-b, -0.5 * b, u / 8, b + 2.5 * u),
};

function offCentre(u: number, b: number, ratio: number): Domain {
  const radius = ratio * b;
  const shift = radius - b;
  return starDomain((a) => -shift * Math.cos(a) + Math.sqrt(radius * radius - (shift * Math.sin(a)) ** 2), () => 1 / radius, RINGS, SECTORS, 3 * u);
}

/** The buffer about an outline corner of that interior angle: an arc about the observation between two straight sides. */
function roundedCorner(u: number, b: number, angle: number): Domain {
  const half = (Math.PI * (180 - angle)) / 360;
  const straight = wallReach([{ angle: half, distance: b }, { angle: -half, distance: b }], b + 5 * u);
  const isArc = (a: number) => Math.abs(Math.atan2(Math.sin(a), Math.cos(a))) <= half;
  return starDomain((a) => (isArc(a) ? b : straight(a)), (a) => (isArc(a) ? 1 / b : 0), RINGS, SECTORS, 3 * u);
}

function hole(u: number, b: number, radius: number): Domain {
  const sectors = Math.min(160, Math.max(48, Math.round((2 * Math.PI * (radius * u + b)) / (0.12 * u))));
  return holeDomain(radius * u, b, u / 10, b + 2.5 * u, sectors);
}

/** Predicted and calculated relative excess of the variance at the domain's observation. */
export function compareVariance(name: string, steps: number, buffer: number): { predicted: number; calculated: number } {
  const u = unitOf(steps);
  const domain = DOMAINS[name](u, buffer * u);
  const node = domain.observation;
  const beyond = domain.same(node);
  const bounded = bandedOperator(domain.bounded).column(node, steps)[node];
  const continued = bandedOperator(domain.continued).column(beyond, steps)[beyond];
  const predicted = predictBoundaryEffect(domain.boundary, Float64Array.of(domain.bounded.x[node], domain.bounded.y[node]), modelOf(steps)).variance[0];
  return { predicted, calculated: bounded / continued - 1 };
}

/**
 * Predicted correlation change at the observation, and the largest calculated one over `partners` nodes no nearer to
 * the boundary, spread over directions and separations up to 3 D.
 */
export function compareCorrelation(name: string, steps: number, buffer: number, partners: number): { predicted: number; calculated: number } {
  const u = unitOf(steps);
  const domain = DOMAINS[name](u, buffer * u);
  const { x, y } = domain.bounded;
  const at = new Float64Array(2 * x.length);
  x.forEach((value, i) => at.set([value, y[i]], 2 * i));
  const distance = distanceToBoundary(domain.boundary, at);
  const node = domain.observation;
  const reach = (i: number) => Math.hypot(x[i] - x[node], y[i] - y[node]);
  const candidates = x.map((_, i) => i).filter((i) => i !== node && distance[i] >= distance[node] * 0.999 && reach(i) < 3 * u && reach(i) > 0.3 * u);
  const chosen = Array.from({ length: Math.min(partners, candidates.length) }, (_, k) => candidates[Math.floor((k * candidates.length) / partners)]);
  const [a, b] = [bandedOperator(domain.bounded), bandedOperator(domain.continued)];
  const [from, fromBeyond] = [a.column(node, steps), b.column(domain.same(node), steps)];
  let calculated = 0;
  for (const i of chosen) {
    const j = domain.same(i);
    const bounded = from[i] / Math.sqrt(from[node] * a.column(i, steps)[i]);
    const continued = fromBeyond[j] / Math.sqrt(fromBeyond[domain.same(node)] * b.column(j, steps)[j]);
    calculated = Math.max(calculated, Math.abs(bounded - continued));
  }
  return { predicted: predictBoundaryEffect(domain.boundary, Float64Array.of(x[node], y[node]), modelOf(steps)).correlation[0], calculated };
}
