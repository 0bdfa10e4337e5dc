import { execFileSync, spawnSync } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { expect, test } from '@playwright/test';

// No browser here: the command people run on their own files, against the production build.
let folder: string;
test.beforeAll(() => {
  folder = mkdtempSync(join(tmpdir(), 'bellkeep-passage-test-'));
});
test.afterAll(() => rmSync(folder, { recursive: true, force: true }));

const make = (name: string, ...args: string[]) =>
  execFileSync('sox', ['-n', ...args.slice(0, -1), join(folder, name), ...(args.at(-1) ?? '').split(' ')]);
const passage = (...args: string[]) =>
  spawnSync(process.execPath, ['lib/launch/passage.mjs', ...args], { encoding: 'utf8', timeout: 120_000 });

test('files made with sox are taken with their true rate, depth, length and hash; what is not sound is told so', async () => {
  test.setTimeout(180_000);
  make('a.wav', '-r', '4000', '-b', '16', 'synth 12 sine 200 gain -12');
  make('b.flac', '-r', '44100', '-b', '24', 'synth 6 pinknoise gain -12');
  make('loud.wav', '-r', '8000', '-b', '16', 'synth 6 sine 97 gain 6');
  writeFileSync(join(folder, 'text.wav'), 'words');
  writeFileSync(join(folder, 'empty.wav'), '');
  writeFileSync(join(folder, 'page.html'), '<p>');
  const files = ['a.wav', 'b.flac', 'loud.wav', 'text.wav', 'empty.wav', 'page.html'].map((name) =>
    join(folder, name),
  );
  const ran = passage('--json', '--model-rate', '4000', ...files);
  expect(ran.status, ran.stderr).toBe(0);
  const lines = ran.stdout
    .trim()
    .split('\n')
    .map((line) => JSON.parse(line));
  expect(lines.map((line) => line.file)).toEqual(files);
  const hashes = execFileSync('sha256sum', files, { encoding: 'utf8' })
    .trim()
    .split('\n')
    .map((line) => line.slice(0, 64));
  expect(lines.slice(0, 5).map((line) => line.sha256)).toEqual(hashes.slice(0, 5));
  expect(lines[0]).toMatchObject({
    accepted: true,
    problem: null,
    sampleRate: 4000,
    bitDepth: 16,
    channels: 1,
    durationSeconds: 12,
    verdict: 'usable',
    filing: null,
  });
  expect(lines[0].custodyEntries).toBeGreaterThanOrEqual(5);
  expect(lines[1]).toMatchObject({ sampleRate: 44_100, bitDepth: 24, verdict: 'repeat' });
  expect(lines[1].findings).toContainEqual(expect.objectContaining({ code: 'rate-unexpected' }));
  expect(lines[2].findings).toContainEqual(expect.objectContaining({ code: 'clipped', severity: 'repeat' }));
  expect(lines[3]).toMatchObject({
    accepted: true,
    verdict: 'repeat',
    findings: [{ code: 'unreadable', severity: 'repeat' }],
  });
  expect(lines[4]).toMatchObject({ accepted: true, verdict: 'repeat' });
  expect(lines[5]).toMatchObject({
    accepted: false,
    problem: { status: 422, type: expect.stringContaining('/problems/media-type-refused') },
  });
});

test('without a file, or with an option it does not know, it says how it is used', () => {
  expect(passage().status).toBe(2);
  expect(passage('--loudly', 'x.wav').stderr).toContain('npm run passage');
});
