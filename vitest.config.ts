import { defineConfig } from 'vitest/config';

/** `npm test` takes *.test.ts; `npm run test:long` takes the Monte Carlo and soak runs in *.long.ts. */
const long = process.env.HUMLEDGER_LONG === '1';

export default defineConfig({
  test: {
    include: long ? ['test/**/*.long.ts'] : ['test/**/*.test.ts'],
    pool: 'forks',
    maxWorkers: 2,
    testTimeout: long ? 3_600_000 : 60_000,
    hookTimeout: 60_000,
    reporters: ['default', ['json', { outputFile: 'node_modules/.vitest/results.json' }]],
  },
});
