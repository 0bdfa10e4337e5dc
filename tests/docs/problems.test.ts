import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { renderToStaticMarkup } from 'react-dom/server';
import { expect, test, vi } from 'vitest';
import ProblemPage from '@/app/(public)/problems/[type]/page';
import { PROBLEMS, type ProblemCode } from '@/lib/contract/problems';
import { problemDocument } from '@/lib/http/problem';

vi.mock('next/navigation', () => import('../support/navigation'));

const codes = Object.keys(PROBLEMS) as ProblemCode[];

function sources(folder: string): string[] {
  return readdirSync(folder, { recursive: true, withFileTypes: true })
    .filter((entry) => entry.isFile() && /\.tsx?$/.test(entry.name))
    .map((entry) => join(entry.parentPath, entry.name));
}

test.each(codes)('the type of %s leads to its page, which says the same', async (code) => {
  const { type, title, keeps, next } = problemDocument(code, {
    requestId: 'r',
    origin: 'https://here.example',
  });
  const [, page, last] = new URL(type).pathname.split('/');
  expect(page).toBe('problems');
  const html = renderToStaticMarkup(await ProblemPage({ params: Promise.resolve({ type: last ?? '' }) }));
  for (const words of [title, keeps, next]) expect(html).toContain(renderToStaticMarkup(words as string));
});

test('the list of problems links each of them', async () => {
  const { default: ProblemsPage } = await import('@/app/(public)/problems/page');
  const html = renderToStaticMarkup(ProblemsPage());
  for (const code of codes) expect(html).toContain(`href="/problems/${code}"`);
});

test('nothing refuses with a code that is not in the catalogue', () => {
  let found = 0;
  for (const file of [...sources('lib'), ...sources('app')]) {
    for (const [, code = ''] of readFileSync(file, 'utf8').matchAll(/new Refusal\(\s*'([^']+)'/g)) {
      expect(codes, file).toContain(code);
      found++;
    }
  }
  expect(found).toBeGreaterThan(50);
});
