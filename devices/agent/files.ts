import { mkdir, open, readdir, readFile, rename, unlink } from 'node:fs/promises';

/** What a disk is asked to do, one operation each, so that a power cut can be tried before and after every one. */
export interface Files {
  /** Make a folder and those above it. @returns the topmost that was made, null when all were there */
  makeFolder(path: string): Promise<string | null>;
  /** A new or emptied file, readable by its owner alone. */
  create(path: string): Promise<{
    write(bytes: Uint8Array): Promise<void>;
    /** Contents are durable after this. */
    sync(): Promise<void>;
    close(): Promise<void>;
  }>;
  rename(from: string, to: string): Promise<void>;
  /** Names in the folder are durable after this. */
  syncFolder(path: string): Promise<void>;
  remove(path: string): Promise<void>;
  /** The file's bytes, or its first `limit`; null when there is none. */
  read(path: string, limit?: number): Promise<Uint8Array | null>;
  /** Names in the folder, none when it is absent. */
  list(path: string): Promise<string[]>;
}

export const isMissing = (error: unknown): boolean => (error as NodeJS.ErrnoException).code === 'ENOENT';

async function readStart(path: string, limit: number): Promise<Uint8Array> {
  const file = await open(path, 'r');
  try {
    const bytes = new Uint8Array(limit);
    let length = 0;
    while (length < limit) {
      const { bytesRead } = await file.read(bytes, length, limit - length, length);
      if (bytesRead === 0) break;
      length += bytesRead;
    }
    return bytes.subarray(0, length);
  } finally {
    await file.close();
  }
}

/** The operating system's files. */
export const systemFiles: Files = {
  async makeFolder(path) {
    return (await mkdir(path, { recursive: true, mode: 0o700 })) ?? null;
  },
  async create(path) {
    const file = await open(path, 'w', 0o600);
    return {
      write: (bytes) => file.writeFile(bytes),
      sync: () => file.sync(),
      close: () => file.close(),
    };
  },
  rename,
  async syncFolder(path) {
    const folder = await open(path, 'r');
    try {
      await folder.sync();
    } finally {
      await folder.close();
    }
  },
  remove: unlink,
  async read(path, limit) {
    try {
      return limit === undefined ? await readFile(path) : await readStart(path, limit);
    } catch (error) {
      if (isMissing(error)) return null;
      throw error;
    }
  },
  async list(path) {
    try {
      return await readdir(path);
    } catch (error) {
      if (isMissing(error)) return [];
      throw error;
    }
  },
};
