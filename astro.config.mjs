import node from '@astrojs/node';
import react from '@astrojs/react';
import tailwindcss from '@tailwindcss/vite';
import { defineConfig, passthroughImageService } from 'astro/config';

export default defineConfig({
  output: 'server',
  adapter: node({ mode: 'standalone' }),
  integrations: [react()],
  image: { service: passthroughImageService() },
  server: { host: process.env.HOST ?? '127.0.0.1', port: Number(process.env.PORT ?? 4280) },
  devToolbar: { enabled: false },
  trailingSlash: 'ignore',
  prefetch: false,
  // Sessions are the application's own (sealed cookie and table); Astro's are not used.
  session: { driver: 'null' },
  security: {
    // The middleware compares Origin itself, for every unsafe method and content type.
    checkOrigin: false,
    // Any Host is believed; the server entry drops X-Forwarded-* unless SELVAGE_TRUST_PROXY is set.
    allowedDomains: [{}],
  },
  experimental: {
    csp: {
      directives: [
        "default-src 'self'",
        "base-uri 'none'",
        "object-src 'none'",
        "frame-ancestors 'none'",
        "form-action 'self'",
        "img-src 'self' data: blob:",
        "font-src 'self'",
        "connect-src 'self'",
        "worker-src 'self' blob:",
      ],
    },
  },
  vite: {
    plugins: [tailwindcss()],
    build: { assetsInlineLimit: 0, chunkSizeWarningLimit: 1200 },
    worker: { format: 'es' },
    ssr: { external: ['@node-rs/argon2', 'pg', 'pg-boss', 'pino', 'sequelize', 'umzug'] },
    optimizeDeps: {
      include: [
        'react',
        'react/jsx-runtime',
        'react/jsx-dev-runtime',
        'react-dom',
        'react-dom/client',
        '@react-three/fiber',
        'three',
        '@observablehq/plot',
        'd3-delaunay',
        'd3-geo',
        'delaunator',
        'robust-predicates',
        'topojson-client',
        'zod/v4',
        'zod/v4-mini',
      ],
    },
    server: { watch: { ignored: ['**/.selvage/**', '**/dist/**', '**/test-results/**', '**/coverage/**'] } },
  },
});
