import { randomUUID } from 'node:crypto';
import { type FileHandle, mkdir, open, readdir, readFile, rename, rm } from 'node:fs/promises';
import { dirname, join } from 'node:path';

/** Make a new or renamed name in a directory outlive a power cut (fsync(2), notes on directories). */
export async function syncDirectory(path: string): Promise<void> {
  const handle = await open(path, 'r');
  try {
    await handle.sync();
  } finally {
    await handle.close();
  }
}

/** A directory whose name is durable in its parent. */
export async function makeDirectory(path: string): Promise<void> {
  const first = await mkdir(path, { recursive: true });
  if (first !== undefined) await syncDirectory(dirname(first));
}

const TEMPORARY = '.part';

/** Write a small file so that after a kill at any point either the old content or the new is there, whole. */
export async function writeWhole(path: string, content: string): Promise<void> {
  const temporary = `${path}.${randomUUID()}${TEMPORARY}`;
  try {
    const handle = await open(temporary, 'wx');
    try {
      await handle.writeFile(content);
      await handle.sync();
    } finally {
      await handle.close();
    }
    await rename(temporary, path);
  } catch (error) {
    await rm(temporary, { force: true });
    throw error;
  }
  await syncDirectory(dirname(path));
}

/** Remove a file durably; one that is not there is no error. */
export async function removeWhole(path: string): Promise<void> {
  await rm(path, { force: true, recursive: true });
  await syncDirectory(dirname(path));
}

/** Every whole JSON file of a directory, parsed; leftovers of interrupted writes are removed. */
export async function readJsonFiles<T>(directory: string): Promise<T[]> {
  const found: T[] = [];
  for (const name of await readdir(directory)) {
    const path = join(directory, name);
    if (name.endsWith(TEMPORARY)) await rm(path, { force: true });
    else if (name.endsWith('.json')) found.push(JSON.parse(await readFile(path, 'utf8')) as T);
  }
  return found;
}

/** Bytes on their way to disk under a name that nothing refers to yet. */
export class BlobWriter {
  private constructor(
    readonly name: string,
    private readonly path: string,
    private readonly handle: FileHandle,
  ) {}

  static async create(directory: string): Promise<BlobWriter> {
    const name = randomUUID();
    const path = join(directory, name);
    return new BlobWriter(name, path, await open(path, 'wx'));
  }

  async write(piece: Uint8Array): Promise<void> {
    for (let done = 0; done < piece.length; ) {
      const { bytesWritten } = await this.handle.write(piece, done);
      done += bytesWritten;
    }
  }

  /** After this the bytes outlive a power cut; they are still nobody's. */
  async finish(): Promise<void> {
    await this.handle.sync();
    await this.handle.close();
    await syncDirectory(dirname(this.path));
  }

  async discard(): Promise<void> {
    await this.handle.close().catch(() => undefined);
    await rm(this.path, { force: true });
  }
}
