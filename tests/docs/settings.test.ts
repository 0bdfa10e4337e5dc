import { readFileSync } from 'node:fs';
import { expect, test } from 'vitest';
import { EnvSchema } from '@/lib/platform/env';

const guide = readFileSync('DEVELOPERS.md', 'utf8');
const table = guide.slice(guide.indexOf('| setting |'));
const told = new Set(
  [...table.slice(0, table.indexOf('\n\n')).matchAll(/^\| (`[^|]+`) \|/gm)].flatMap(([, names = '']) =>
    [...names.matchAll(/`(\w+)`/g)].map(([, name]) => name),
  ),
);

test('the guide lists every setting that is read, and none that is not', () => {
  const read = Object.keys(EnvSchema.shape).filter((name) => name !== 'NODE_ENV');
  expect([...told].sort()).toEqual(read.sort());
});
