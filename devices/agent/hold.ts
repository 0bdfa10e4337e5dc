import { randomBytes } from 'node:crypto';
import { link, mkdir, readFile, rename, unlink, writeFile } from 'node:fs/promises';
import { join } from 'node:path';
import { isMissing } from './files';

/** Another process has the state folder. */
export class FolderHeld extends Error {}

/**
 * When a process began, in the kernel's ticks (proc(5), field 22 of stat, from memory): tells a process from a later
 * one with the same number. Empty where there is no /proc.
 */
async function beganAt(pid: number): Promise<string> {
  const stat = await readFile(`/proc/${pid}/stat`, 'utf8').catch(() => '');
  // The second field is a name in parentheses that may hold spaces and parentheses of its own.
  return stat.slice(stat.lastIndexOf(')') + 2).split(' ')[19] ?? '';
}

async function isAlive(holder: string): Promise<boolean> {
  const [pid, began] = holder.split(' ');
  try {
    process.kill(Number(pid), 0);
  } catch (error) {
    return (error as NodeJS.ErrnoException).code === 'EPERM';
  }
  return !began || began === (await beganAt(Number(pid)));
}

/**
 * Have a state folder to oneself. Two processes with one key would each renew the credential, and the one that went
 * on with the retired one would look like a thief. A holder that died, however it died, holds nothing.
 *
 * @returns a function that lets go
 * @throws FolderHeld
 */
export async function holdFolder(folder: string): Promise<() => Promise<void>> {
  await mkdir(folder, { recursive: true, mode: 0o700 });
  const path = join(folder, 'held');
  const me = `${process.pid} ${await beganAt(process.pid)}`;
  const mine = `${path}.${randomBytes(6).toString('hex')}`;
  await writeFile(mine, me, { mode: 0o600 });
  try {
    for (let attempt = 0; attempt < 5; attempt++) {
      try {
        // A link is made whole or not at all, and never over another.
        await link(mine, path);
        return () => letGo(path, me);
      } catch (error) {
        if ((error as NodeJS.ErrnoException).code !== 'EEXIST') throw error;
      }
      const holder = await readFile(path, 'utf8').catch(() => '');
      if (holder !== '' && (await isAlive(holder)))
        throw new FolderHeld(`${folder} is in use by process ${holder.split(' ')[0]}.`);
      await takeAway(path, holder);
    }
    throw new FolderHeld(`${folder} is being taken by others.`);
  } finally {
    await unlink(mine);
  }
}

/** Remove what a dead process left, unless somebody took the folder since it was read. */
async function takeAway(path: string, holder: string): Promise<void> {
  const aside = `${path}.${randomBytes(6).toString('hex')}`;
  try {
    await rename(path, aside);
  } catch (error) {
    if (isMissing(error)) return;
    throw error;
  }
  if ((await readFile(aside, 'utf8')) !== holder) await link(aside, path).catch(() => undefined);
  await unlink(aside);
}

async function letGo(path: string, me: string): Promise<void> {
  if ((await readFile(path, 'utf8').catch(() => '')) === me) await unlink(path);
}
