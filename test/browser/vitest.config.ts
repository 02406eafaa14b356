import { defineConfig } from 'vitest/config';

/** The tests that need a browser: `npm run test:browser`. They are not part of `npm test`. */
export default defineConfig({
  test: {
    include: ['test/browser/**/*.browser.ts'],
    reporters: ['default', './test/helpers/reporter.ts'],
    testTimeout: 60_000,
    hookTimeout: 120_000,
    fileParallelism: false,
  },
});
