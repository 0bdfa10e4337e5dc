import { randomBytes } from 'node:crypto';
import { dirname, join, resolve, sep } from 'node:path';
import { type Files, isMissing, systemFiles } from './files';

/** Files of one device, by name (`device.json`, `queue/…`). What returned is durable. */
export interface Disk {
  /** The file's bytes, or its first `limit`; null when there is none. */
  read(name: string, limit?: number): Promise<Uint8Array | null>;
  /** Write or replace: a power cut leaves the old file or the new one, never half of either. */
  write(name: string, bytes: Uint8Array | string): Promise<void>;
  /** Remove; one that is absent is removed already. */
  remove(name: string): Promise<void>;
  /** Names in a folder of the disk, in order, without unfinished files. */
  list(folder: string): Promise<string[]>;
  /** Throw away what a process that is gone left unfinished in a folder. */
  sweep(folder: string): Promise<void>;
}

/** Unfinished files say whose they are, so that a sweep never takes one that is being written. */
const PART = /\.(\d+)-[0-9a-f]+\.part$/;
const unfinished = new Set<string>();

function isWorking(path: string): boolean {
  const pid = Number(PART.exec(path)?.[1]);
  if (pid === process.pid) return unfinished.has(path);
  try {
    process.kill(pid, 0);
    return true;
  } catch (error) {
    return (error as NodeJS.ErrnoException).code === 'EPERM';
  }
}

const utf8 = new TextEncoder();
const bytesOf = (content: Uint8Array | string): Uint8Array =>
  typeof content === 'string' ? utf8.encode(content) : content;

async function writeWhole(files: Files, path: string, bytes: Uint8Array): Promise<void> {
  const part = `${path}.${process.pid}-${randomBytes(6).toString('hex')}.part`;
  unfinished.add(part);
  try {
    const file = await files.create(part);
    try {
      await file.write(bytes);
      await file.sync();
    } finally {
      await file.close();
    }
    await files.rename(part, path);
    // Durable from here, not from the rename: the name is kept by the folder, not by the file.
    await files.syncFolder(dirname(path));
  } catch (error) {
    // A full disk must not stay full of halves. When this fails too, the next sweep does it.
    await files.remove(part).catch(() => undefined);
    throw error;
  } finally {
    unfinished.delete(part);
  }
}

/** A folder as a device's disk. It is made when the first file is written. */
export function folderDisk(folder: string, files: Files = systemFiles): Disk {
  const root = resolve(folder);
  const made = new Set<string>();
  const haveFolder = async (path: string): Promise<void> => {
    if (made.has(path)) return;
    const first = await files.makeFolder(path);
    // A folder that a power cut takes away takes its files along, so its name must be durable too. This also makes
    // up for a process that died between making the folder and this.
    const top = first !== null && root.startsWith(first + sep) ? first : root;
    for (let at = path; ; at = dirname(at)) {
      await files.syncFolder(dirname(at));
      if (at === top || at === dirname(at)) break;
    }
    made.add(path);
  };
  return {
    read: (name, limit) => files.read(join(root, name), limit),
    async write(name, content) {
      const path = join(root, name);
      await haveFolder(dirname(path));
      await writeWhole(files, path, bytesOf(content));
    },
    async remove(name) {
      const path = join(root, name);
      try {
        await files.remove(path);
      } catch (error) {
        if (isMissing(error)) return;
        throw error;
      }
      await files.syncFolder(dirname(path));
    },
    async list(folder) {
      return (await files.list(join(root, folder))).filter((name) => !name.endsWith('.part')).sort();
    },
    async sweep(folder) {
      for (const name of await files.list(join(root, folder))) {
        const path = join(root, folder, name);
        if (!PART.test(name) || isWorking(path)) continue;
        await files.remove(path).catch((error: unknown) => {
          if (!isMissing(error)) throw error;
        });
      }
    },
  };
}

/** A disk that lasts as long as its object. */
export function memoryDisk(): Disk {
  const kept = new Map<string, Uint8Array>();
  return {
    async read(name, limit) {
      return kept.get(name)?.slice(0, limit) ?? null;
    },
    async write(name, content) {
      kept.set(name, bytesOf(content).slice());
    },
    async remove(name) {
      kept.delete(name);
    },
    async list(folder) {
      const start = `${folder}/`;
      return [...kept.keys()]
        .filter((name) => name.startsWith(start))
        .map((name) => name.slice(start.length))
        .sort();
    },
    async sweep() {},
  };
}
