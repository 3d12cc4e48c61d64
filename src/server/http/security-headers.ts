import type { OutgoingHttpHeader, OutgoingHttpHeaders, ServerResponse } from 'node:http';

const ALWAYS: Record<string, string> = {
  'x-content-type-options': 'nosniff',
  'referrer-policy': 'same-origin',
  'cross-origin-opener-policy': 'same-origin',
  'cross-origin-resource-policy': 'same-origin',
  'permissions-policy': 'camera=(), geolocation=(), microphone=(), payment=(), usb=()',
};

/** For what is not a page: nothing in it may run or be framed. */
const NOT_A_PAGE = "default-src 'none'; frame-ancestors 'none'";

// Plots and React set style attributes, and Plot adds a style element to each figure; scripts stay with Astro's hashes.
const STYLES = "style-src-elem 'self' 'unsafe-inline'; style-src-attr 'unsafe-inline'";

/** Adds the security headers when `response` writes its head. `isSecure`: people reach us by https. */
export function addSecurityHeaders(response: ServerResponse, isSecure: boolean): void {
  beforeHead(response, () => {
    for (const [name, value] of Object.entries(ALWAYS)) response.setHeader(name, value);
    if (isSecure) response.setHeader('strict-transport-security', 'max-age=31536000');
    const isPage = String(response.getHeader('content-type') ?? '').startsWith('text/html');
    const policy = response.getHeader('content-security-policy');
    if (isPage) {
      response.setHeader('content-security-policy', `${policy === undefined ? "default-src 'self'; frame-ancestors 'none'" : String(policy).replace(/;?\s*$/, '')}; ${STYLES}`);
      if (!response.hasHeader('cache-control')) response.setHeader('cache-control', 'private, no-cache');
    } else if (policy === undefined && !response.hasHeader('last-modified')) {
      response.setHeader('content-security-policy', NOT_A_PAGE);
    }
  });
}

/** Calls `change` just before the head is written, with all headers set on the response. */
export function beforeHead(response: ServerResponse, change: () => void): void {
  const writeHead = response.writeHead.bind(response) as (status: number, message?: string) => ServerResponse;
  let done = false;
  response.writeHead = ((status: number, ...rest: unknown[]) => {
    const message = typeof rest[0] === 'string' ? rest[0] : undefined;
    const headers = (message === undefined ? rest[0] : rest[1]) as OutgoingHttpHeaders | OutgoingHttpHeader[] | undefined;
    if (!done) {
      done = true;
      for (const [name, value] of pairs(headers)) response.setHeader(name, value);
      response.statusCode = status;
      change();
    }
    return message === undefined ? writeHead(status) : writeHead(status, message);
  }) as typeof response.writeHead;
}

function pairs(headers: OutgoingHttpHeaders | OutgoingHttpHeader[] | undefined): [string, OutgoingHttpHeader][] {
  if (headers === undefined) return [];
  const all: [string, OutgoingHttpHeader | undefined][] = Array.isArray(headers)
    ? Array.from({ length: headers.length / 2 }, (_, i) => [String(headers[2 * i]), headers[2 * i + 1]])
    : Object.entries(headers);
  return all.filter((pair): pair is [string, OutgoingHttpHeader] => pair[1] !== undefined);
}
