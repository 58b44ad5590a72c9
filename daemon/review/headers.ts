/**
 * Sent with every answer, errors included. Nothing may be loaded but our own style, script and mark; nobody may frame
 * the page, read it from another origin or keep a copy. `same-origin` (not `no-referrer`): with the latter a browser
 * sends `Origin: null` with our own form, and we would have to refuse it.
 */
export const SECURITY_HEADERS: readonly (readonly [name: string, value: string])[] = [
  [
    'Content-Security-Policy',
    [
      "default-src 'none'",
      "style-src 'self'",
      "script-src 'self'",
      "img-src 'self'",
      "connect-src 'self'",
      "form-action 'self'",
      "frame-ancestors 'none'",
      "base-uri 'none'",
      "require-trusted-types-for 'script'",
    ].join('; '),
  ],
  ['X-Content-Type-Options', 'nosniff'],
  ['X-Frame-Options', 'DENY'],
  ['Cache-Control', 'no-store'],
  ['Cross-Origin-Opener-Policy', 'same-origin'],
  ['Cross-Origin-Resource-Policy', 'same-origin'],
  ['Referrer-Policy', 'same-origin'],
  ['Permissions-Policy', 'camera=(), geolocation=(), microphone=()'],
];

/** RFC 6797: the browser does not come back in plain HTTP. Sent under TLS alone. */
export const TLS_ONLY_HEADER = ['Strict-Transport-Security', 'max-age=31536000'] as const;
