import { createHash } from 'node:crypto';
import { type FileHandle, open, readdir, readFile, rm } from 'node:fs/promises';
import { join } from 'node:path';
import type { Checksums } from './checksums';
import { BlobWriter, makeDirectory, readJsonFiles, removeWhole, writeWhole } from './disk';
import { noSuchKey, S3Error } from './errors';
import { KeyIndex } from './keyIndex';
import type { DefaultRetention, Locked } from './locks';
import { loadUploads, type Upload } from './multipart';
import { NamedMutex } from './mutex';

/** What is kept of an object besides its bytes. */
export interface ObjectRecord extends Locked {
  key: string;
  /** Name of the file that holds the bytes. */
  blob: string;
  sizeBytes: number;
  /** Without its quotes. */
  etag: string;
  modifiedMs: number;
  /** Content-Type and its like, by lower-case header name. */
  system: Record<string, string>;
  /** `x-amz-meta-…` without the prefix. */
  meta: Record<string, string>;
  tags: Record<string, string>;
  checksums: Checksums;
  checksumType?: 'FULL_OBJECT' | 'COMPOSITE' | undefined;
  partSizes?: number[] | undefined;
}

export interface BucketRecord {
  name: string;
  createdMs: number;
  objectLock: boolean;
  defaultRetention?: DefaultRetention | undefined;
}

export interface Bucket {
  record: BucketRecord;
  index: KeyIndex<ObjectRecord>;
  uploads: Map<string, Upload>;
  directory: string;
}

/**
 * Buckets and objects on disk.
 *
 * An object is two files: a blob with its bytes under a random name, and a record that names the blob. The blob is
 * written and synced first; the rename of the record is the one moment at which the object exists, is replaced or is
 * gone. A process killed before it leaves a blob that no record names, and `open` removes those. A key never becomes
 * a path: the record's name is the key's SHA-256.
 *
 * One process a directory: the records are also held in memory.
 */
export class ObjectStore {
  private readonly buckets = new Map<string, Bucket>();
  private readonly locks = new NamedMutex();

  private constructor(private readonly root: string) {}

  static async open(root: string): Promise<ObjectStore> {
    const store = new ObjectStore(root);
    await makeDirectory(store.blobs);
    await makeDirectory(join(root, 'buckets'));
    const used = new Set<string>();
    for (const name of await readdir(join(root, 'buckets'))) {
      const directory = store.bucketDirectory(name);
      const text = await readFile(join(directory, 'bucket.json'), 'utf8').catch(() => undefined);
      if (text === undefined) {
        await removeWhole(directory);
        continue;
      }
      const index = new KeyIndex<ObjectRecord>();
      const records = await readJsonFiles<ObjectRecord>(join(directory, 'objects'));
      index.load(records.map((record) => [record.key, record] as const));
      const uploads = await loadUploads(join(directory, 'uploads'));
      for (const record of records) used.add(record.blob);
      for (const upload of uploads.values()) for (const part of upload.parts.values()) used.add(part.blob);
      store.buckets.set(name, { record: JSON.parse(text) as BucketRecord, index, uploads, directory });
    }
    for (const blob of await readdir(store.blobs)) if (!used.has(blob)) await rm(store.blobPath(blob));
    return store;
  }

  private get blobs(): string {
    return join(this.root, 'blobs');
  }

  private bucketDirectory(name: string): string {
    return join(this.root, 'buckets', name);
  }

  blobPath(blob: string): string {
    return join(this.blobs, blob);
  }

  listBuckets(): BucketRecord[] {
    return [...this.buckets.values()].map(({ record }) => record).sort((a, b) => (a.name < b.name ? -1 : 1));
  }

  find(name: string): Bucket | undefined {
    return this.buckets.get(name);
  }

  /** @throws S3Error NoSuchBucket */
  bucket(name: string): Bucket {
    const bucket = this.buckets.get(name);
    if (bucket === undefined) {
      throw new S3Error('NoSuchBucket', 'The specified bucket does not exist', { BucketName: name });
    }
    return bucket;
  }

  /** @throws S3Error InvalidBucketName, BucketAlreadyOwnedByYou */
  async createBucket(record: BucketRecord): Promise<void> {
    const { name } = record;
    if (!/^[a-z0-9][a-z0-9.-]{1,61}[a-z0-9]$/.test(name) || name.includes('..')) {
      throw new S3Error('InvalidBucketName', 'The specified bucket is not valid.', { BucketName: name });
    }
    await this.locks.run(`bucket ${name}`, async () => {
      if (this.buckets.has(name)) {
        throw new S3Error(
          'BucketAlreadyOwnedByYou',
          'Your previous request to create the named bucket succeeded and you already own it.',
          { BucketName: name },
        );
      }
      const directory = this.bucketDirectory(name);
      await makeDirectory(join(directory, 'objects'));
      await makeDirectory(join(directory, 'uploads'));
      await writeWhole(join(directory, 'bucket.json'), JSON.stringify(record));
      this.buckets.set(name, { record, index: new KeyIndex(), uploads: new Map(), directory });
    });
  }

  async updateBucket(bucket: Bucket, record: BucketRecord): Promise<void> {
    await writeWhole(join(bucket.directory, 'bucket.json'), JSON.stringify(record));
    bucket.record = record;
  }

  /** @throws S3Error NoSuchBucket, BucketNotEmpty */
  async deleteBucket(name: string): Promise<void> {
    await this.locks.run(`bucket ${name}`, async () => {
      const bucket = this.bucket(name);
      if (bucket.index.size > 0) {
        throw new S3Error('BucketNotEmpty', 'The bucket you tried to delete is not empty', {
          BucketName: name,
        });
      }
      this.buckets.delete(name);
      await removeWhole(join(bucket.directory, 'bucket.json'));
      await removeWhole(bucket.directory);
      for (const upload of bucket.uploads.values()) {
        for (const part of upload.parts.values()) await rm(this.blobPath(part.blob), { force: true });
      }
    });
  }

  newBlob(): Promise<BlobWriter> {
    return BlobWriter.create(this.blobs);
  }

  async removeBlob(blob: string): Promise<void> {
    await rm(this.blobPath(blob), { force: true });
  }

  /**
   * Give a key its new record. `decide` sees what is there at that moment, alone, and may throw to refuse: of two
   * conditional writes at once the second sees the first.
   */
  async commit(
    bucket: Bucket,
    key: string,
    decide: (current: ObjectRecord | undefined) => ObjectRecord,
  ): Promise<ObjectRecord> {
    return this.locks.run(`object ${bucket.record.name}/${key}`, async () => {
      this.bucket(bucket.record.name);
      const current = bucket.index.get(key);
      const record = decide(current);
      await writeWhole(this.recordPath(bucket, key), JSON.stringify(record));
      bucket.index.set(key, record);
      if (current !== undefined && current.blob !== record.blob) await this.removeBlob(current.blob);
      return record;
    });
  }

  /** Remove an object; one that is not there is no error. `check` may throw to refuse. */
  async remove(
    bucket: Bucket,
    key: string,
    check: (current: ObjectRecord | undefined) => void,
  ): Promise<void> {
    await this.locks.run(`object ${bucket.record.name}/${key}`, async () => {
      const current = bucket.index.get(key);
      check(current);
      if (current === undefined) return;
      await removeWhole(this.recordPath(bucket, key));
      bucket.index.delete(key);
      await this.removeBlob(current.blob);
    });
  }

  /**
   * An object with its bytes open for reading: they stay readable when the key is overwritten meanwhile.
   *
   * @throws S3Error NoSuchKey
   */
  async openObject(bucket: Bucket, key: string): Promise<{ record: ObjectRecord; file: FileHandle }> {
    for (let attempt = 0; ; attempt++) {
      const record = bucket.index.get(key);
      if (record === undefined) throw noSuchKey(key);
      try {
        return { record, file: await open(this.blobPath(record.blob), 'r') };
      } catch (error) {
        // Between the look at the record and the opening the key may have got another blob.
        if (bucket.index.get(key) === record || attempt > 10) throw error;
      }
    }
  }

  private recordPath(bucket: Bucket, key: string): string {
    return join(bucket.directory, 'objects', `${createHash('sha256').update(key).digest('hex')}.json`);
  }
}
