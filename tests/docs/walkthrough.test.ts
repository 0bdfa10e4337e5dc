import { execFile } from 'node:child_process';
import { mkdtemp, readFile, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { promisify } from 'node:util';
import { eq } from 'drizzle-orm';
import { renderToStaticMarkup } from 'react-dom/server';
import { afterAll, beforeAll, expect, test, vi } from 'vitest';
import DeviceApiPage from '@/app/(public)/device-api/page';
import { recording } from '@/db/schema';
import { openPassageHouse, type PassageHouse } from '../support/passageHouse';

vi.mock('next/navigation', () => import('../support/navigation'));

const run = promisify(execFile);
let house: PassageHouse;
beforeAll(async () => {
  house = await openPassageHouse();
});
afterAll(() => house.close());

const plain = (text: string) =>
  text
    .replaceAll('&lt;', '<')
    .replaceAll('&gt;', '>')
    .replaceAll('&quot;', '"')
    .replaceAll('&#x27;', "'")
    .replaceAll('&amp;', '&');

/** The blocks of the page as a reader would copy them. */
async function blocks(): Promise<{ step: string; either: string | null; code: string }[]> {
  const page = renderToStaticMarkup(await DeviceApiPage());
  return [...page.matchAll(/<code data-step="([^"]+)"( data-either="[^"]+")?[^>]*>([\s\S]*?)<\/code>/g)].map(
    ([, step = '', either = null, code = '']) => ({ step, either: either ?? null, code: plain(code) }),
  );
}

test.each(['p-256', 'ed25519'])(
  'the walk-through works as it is printed, with a key on %s',
  async (curve) => {
    const listed = await house.listDevice();
    const folder = await mkdtemp(join(tmpdir(), 'bellkeep-walk-'));
    try {
      const printed = await blocks();
      expect(printed.map(({ step }) => step)).toContain(curve);
      const script = printed
        .filter(({ step, either }) => either === null || step === curve)
        .map(({ code }) => code)
        .join('\n');
      const { stdout } = await run('/bin/bash', ['-c', script], {
        cwd: folder,
        env: {
          NODE_ENV: 'test',
          PATH: process.env.PATH ?? '',
          ORIGIN: house.origin,
          SERIAL: listed.serialNumber,
          CODE: listed.code,
        },
      });
      expect(stdout).toContain(listed.assetTag);
      expect(stdout).toMatch(/^(usable|care|repeat)$/m);
      const verdict = JSON.parse(await readFile(join(folder, 'verdict.json'), 'utf8')) as {
        recording: string;
      };
      const [row] = await house.services.read
        .select({ stage: recording.stage, deviceId: recording.deviceId })
        .from(recording)
        .where(eq(recording.number, verdict.recording));
      expect(row).toEqual({ stage: 'measured', deviceId: listed.id });
      const credentials = await house.services.read.query.credential.findMany({
        where: (t) => eq(t.deviceId, listed.id),
      });
      expect(credentials.map(({ state }) => state).sort()).toEqual(['in-use', 'retired']);
    } finally {
      await rm(folder, { recursive: true, force: true });
    }
  },
);
