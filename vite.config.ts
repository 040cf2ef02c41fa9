import { VitePWA } from 'vite-plugin-pwa';
import { defineConfig } from 'vitest/config';

export default defineConfig({
  base: './',
  publicDir: 'src/app/static',
  worker: { format: 'es' },
  build: { target: 'es2022', outDir: 'dist', sourcemap: false, chunkSizeWarningLimit: 700 },
  plugins: [
    VitePWA({
      // The page asks before it changes under a person's hands: never in the middle of a flight.
      registerType: 'prompt',
      injectRegister: null,
      includeAssets: ['icon.svg'],
      manifest: {
        name: 'Gustbench',
        short_name: 'Gustbench',
        description: 'A flight bench for custom quadcopters.',
        start_url: './',
        scope: './',
        display: 'standalone',
        background_color: '#F6F4EE',
        theme_color: '#F6F4EE',
        icons: [{ src: 'icon.svg', sizes: 'any', type: 'image/svg+xml', purpose: 'any' }],
      },
      workbox: {
        globPatterns: ['**/*.{js,css,html,svg,json,webmanifest}'],
        maximumFileSizeToCacheInBytes: 4_000_000,
      },
    }),
  ],
  test: {
    include: ['test/**/*.test.ts', 'test/**/*.test.tsx'],
    testTimeout: 60_000,
    hookTimeout: 120_000,
    maxWorkers: 2,
    setupFiles: ['test/setup.ts'],
  },
});
