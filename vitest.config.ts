import { fileURLToPath } from 'node:url';
import { defineConfig } from 'vitest/config';

export default defineConfig({
  resolve: { alias: { '@': fileURLToPath(new URL('.', import.meta.url)) } },
  test: {
    include: ['tests/**/*.test.ts'],
    exclude: ['tests/browser/**', 'node_modules/**'],
    // A database file, a storage fake and real sockets per file: two files at a time is what two cores carry.
    maxWorkers: 2,
    testTimeout: 60_000,
    hookTimeout: 120_000,
    restoreMocks: true,
  },
});
