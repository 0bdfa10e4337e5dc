import { type ChildProcess, spawn } from 'node:child_process';
import { mkdtempSync, rmSync } from 'node:fs';
import { readdir, readFile, writeFile } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { afterEach, beforeEach, expect, test } from 'vitest';
import { folderDisk } from '@/devices/agent/disk';
import { NumberTaken, openQueue } from '@/devices/agent/queue';
import { beginLife, PowerLost } from '@/devices/fleet/life';

let folder: string;
beforeEach(() => {
  folder = mkdtempSync(join(tmpdir(), 'bellkeep-queue-'));
});
afterEach(() => rmSync(folder, { recursive: true, force: true }));

const clipOf = (n: number) => ({
  recordingNumber: `clip-${n}`,
  bytes: new Uint8Array(20_000).fill(n),
  mediaType: 'audio/wav',
  recordedAt: 1_800_000_000_000 + n,
});
const numbers = async () =>
  (await (await openQueue(folderDisk(folder))).list()).map((e) => e.recordingNumber);

test('a writer killed at any moment loses no clip it was told is safe, and doubles none', async () => {
  let safe = 0;
  for (let kill = 0; kill < 20; kill++) {
    const child: ChildProcess = spawn(
      process.execPath,
      ['--import', 'tsx', 'tests/devices/queueWriter.ts', folder, String(safe + 1)],
      { stdio: ['ignore', 'pipe', 'inherit'] },
    );
    const wanted = 1 + (kill % 4);
    let told = 0;
    await new Promise<void>((resolve) => {
      child.on('exit', () => resolve());
      child.stdout?.on('data', (data: Buffer) => {
        told += data.toString().split('\n').length - 1;
        if (told >= wanted) setTimeout(() => child.kill('SIGKILL'), kill % 5);
      });
    });
    const found = await numbers();
    expect(new Set(found).size).toBe(found.length);
    for (let n = 1; n <= safe + told; n++) expect(found).toContain(`clip-${n}`);
    safe = found.length;
  }
  const queue = await openQueue(folderDisk(folder));
  for (const entry of await queue.list()) {
    const n = Number(entry.recordingNumber?.split('-')[1]);
    expect(
      Buffer.from(clipOf(n).bytes).equals((await queue.clipOf(entry.place))?.bytes ?? new Uint8Array()),
    ).toBe(true);
  }
  expect((await readdir(join(folder, 'queue'))).filter((name) => name.endsWith('.part'))).toEqual([]);
}, 180_000);

test('power that goes at each single step of taking and journalling leaves a clip as it was or as it became', async () => {
  for (let step = 1; step < 200; step++) {
    rmSync(folder, { recursive: true, force: true });
    const life = beginLife(fetch, async () => undefined);
    life.dieAfter(step);
    let reached = 'nothing';
    try {
      const queue = await openQueue(folderDisk(folder, life.files));
      const place = await queue.add(clipOf(1));
      reached = 'queued';
      await queue.note(place, { state: 'put', recording: '7K3F-92QX' });
      reached = 'put';
    } catch (error) {
      expect(error).toBeInstanceOf(PowerLost);
    }
    const after = await (await openQueue(folderDisk(folder))).list();
    if (reached !== 'nothing') expect(after).toHaveLength(1);
    if (reached === 'put') expect(after[0]?.journal.state).toBe('put');
    if (after[0]) expect(['queued', 'put']).toContain(after[0].journal.state);
    if (reached === 'put') return expect(step).toBeGreaterThan(20);
  }
  throw new Error('the work never came to its end');
});

test('the same clip again is the one that is there, and its number with other bytes is refused', async () => {
  const queue = await openQueue(folderDisk(folder));
  const place = await queue.add(clipOf(1));
  expect(await queue.add(clipOf(1))).toBe(place);
  await expect(queue.add({ ...clipOf(2), recordingNumber: 'clip-1' })).rejects.toThrow(NumberTaken);
});

test('bytes that changed on the disk are never given out as the clip', async () => {
  const queue = await openQueue(folderDisk(folder));
  const place = await queue.add(clipOf(1));
  const path = join(folder, 'queue', `${place}.clip`);
  const bytes = await readFile(path);
  bytes[bytes.length - 1] = 77;
  await writeFile(path, bytes);
  expect(await queue.clipOf(place)).toBeNull();
});
