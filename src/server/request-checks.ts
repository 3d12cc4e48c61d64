import { AppError } from './errors.ts';

const SAFE = new Set(['GET', 'HEAD', 'OPTIONS']);

/**
 * Refuses an unsafe request that a page of another origin sent (OWASP ASVS 5.0, 3.5): browsers state the origin, and a
 * program without a browser sends neither header.
 * @throws AppError ORIGIN_REFUSED
 */
export const checkRequest = (request: Request, url: URL): void => {
  if (SAFE.has(request.method)) return;
  const origin = request.headers.get('origin');
  const site = request.headers.get('sec-fetch-site');
  const isForeign = origin !== null ? origin === 'null' || new URL(origin).host !== url.host : site !== null && site !== 'same-origin' && site !== 'none';
  if (isForeign) throw new AppError('ORIGIN_REFUSED', 'This request came from a page of another site, so it was not carried out. Use Selvage’s own pages.');
};
