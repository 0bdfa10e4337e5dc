import { expect, test } from 'vitest';
import { fuzzDecode } from '../../../fuzz/decode';

// More of them: npm run fuzz.
test('mutated files of every kind are decoded or refused, and nothing is thrown', async () => {
  const report = await fuzzDecode(4711, (cases) => cases < 500);
  expect(report.failures).toEqual([]);
  expect(report.cases).toBe(500);
  // Mutations that all failed at the first byte would prove nothing.
  expect(report.outcomes.decoded).toBeGreaterThan(100);
  expect(Object.keys(report.outcomes).length).toBeGreaterThan(12);
});
