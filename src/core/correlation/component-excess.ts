/**
 * The boundary effect on the variance of the two components (u, v) of a field made from a stream function and a
 * velocity potential (Daley 1991, section 5.2). A straight side changes the derivative along its normal by
 * D² c''(2d) and the one along it by -D² c'(2d)/(2d), relative and of either sign.
 */
import { discDerivativeExcess } from './disc.ts';
import { maternDerivatives } from './matern.ts';

/** Relative changes of the variance of the component across the side and of the one along it, signed. */
export interface ComponentExcess {
  across: number;
  along: number;
}

/** Straight side at distance d (scales), m >= 3; `share` is the rotational share, 0 to 1. */
export function straightComponentExcess(m: number, d: number, share: number): ComponentExcess {
  const square = 2 * m - 4;
  const c = maternDerivatives(m, 2 * d);
  const normal = square * c.second;
  const tangential = d === 0 ? 1 : (-square * c.first) / (2 * d);
  // the stream function's tangential derivative is the component across the side
  return {
    across: share * tangential + (1 - share) * normal,
    along: share * normal + (1 - share) * tangential,
  };
}

/** As above, at a corner whose boundary is an arc of radius d about the observation through `turning` radians. */
export function cornerComponentExcess(m: number, d: number, turning: number, share: number): ComponentExcess {
  const side = straightComponentExcess(m, d, share);
  const focus = (turning / (2 * Math.PI)) * discDerivativeExcess(m, d);
  return { across: side.across + focus, along: side.along + focus };
}

/** The larger magnitude of the two. */
export const largestComponent = (excess: ComponentExcess): number => Math.max(Math.abs(excess.across), Math.abs(excess.along));
