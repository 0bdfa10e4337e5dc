import { randomBytes } from 'node:crypto';
import { mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { createServices, provideServices } from '@/lib/http/services';
import { Message } from '@/lib/mail/port';
import type { Clock } from '@/lib/platform/clock';
import { type Env, readEnv } from '@/lib/platform/env';
import { createLog } from '@/lib/platform/log';
import { runOutboxOnce } from '@/lib/platform/outbox';
import type { Services } from '@/lib/platform/services';
import { type StorageFake, type StorageFakeOptions, startStorageFake } from '@/storage-fake/server';
import { freshDatabase } from './database';

export const ORIGIN = 'https://bellkeep.test';

/** The real time, moved on by as much as a test says. */
export interface TestClock extends Clock {
  advance(ms: number): void;
}

export interface House {
  services: Services;
  clock: TestClock;
  /** Messages handed over so far. */
  mail: Message[];
  /** Send what waits in the outbox, and give back all messages so far. */
  deliver(): Promise<Message[]>;
  /** Every line logged so far. */
  log: string[];
  /** Only where it was asked for. */
  fake: StorageFake;
  close(): Promise<void>;
}

export interface HouseOptions {
  env?: Record<string, string>;
  /** Start a storage fake; without it storage answers nothing. */
  storage?: boolean | Partial<StorageFakeOptions>;
  overrides?: Partial<Services>;
}

/**
 * A whole house on a database file of its own, with memory for mail and log, and a storage fake on request. The routes
 * of this test file find it from now on.
 */
export async function openHouse(options: HouseOptions = {}): Promise<House> {
  const fresh = await freshDatabase();
  const folder = await mkdtemp(join(tmpdir(), 'bellkeep-house-'));
  const fake = options.storage
    ? await startStorageFake({
        dir: join(folder, 'store'),
        accessKey: 'TESTKEY',
        secretKey: 'test-secret-key',
        bucket: 'bellkeep',
        ...(options.storage === true ? {} : options.storage),
      })
    : null;
  let offset = 0;
  const clock: TestClock = {
    now: () => Date.now() + offset,
    advance: (ms) => {
      offset += ms;
    },
  };
  const mail: Message[] = [];
  const log: string[] = [];
  const services = await createServices(testEnv(fresh.file, fake, options.env), {
    database: fresh.database,
    clock,
    mail: { kind: 'folder', send: async (message) => void mail.push(message) },
    log: createLog('trace', { write: (line) => void log.push(line) }),
    ...options.overrides,
  });
  provideServices(services);
  return {
    services,
    clock,
    mail,
    log,
    async deliver() {
      await runOutboxOnce(services, { mail: (payload) => services.mail.send(Message.parse(payload)) });
      return mail;
    },
    get fake() {
      if (!fake) throw new Error('this house was opened without storage');
      return fake;
    },
    async close() {
      await fake?.close();
      await fresh.close();
      await rm(folder, { recursive: true, force: true });
    },
  };
}

const testEnv = (file: string, fake: StorageFake | null, more: Record<string, string> = {}): Env =>
  readEnv({
    NODE_ENV: 'test',
    BELLKEEP_ORIGIN: ORIGIN,
    BELLKEEP_SECRET_KEY: randomBytes(32).toString('base64'),
    BELLKEEP_AUTH_SECRET: randomBytes(32).toString('base64'),
    DATABASE_URL: `file:${file}`,
    S3_ENDPOINT: fake?.url ?? 'http://127.0.0.1:9',
    S3_BUCKET: 'bellkeep',
    S3_ACCESS_KEY_ID: 'TESTKEY',
    S3_SECRET_ACCESS_KEY: 'test-secret-key',
    ...more,
  });
