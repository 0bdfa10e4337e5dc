import { openDatabase } from '@/db/client';
import { createMail } from '@/lib/mail/nodemailer';
import { systemClock } from '@/lib/platform/clock';
import { type Env, readEnv } from '@/lib/platform/env';
import { createLog } from '@/lib/platform/log';
import { createSecretBox } from '@/lib/platform/secretBox';
import type { Services } from '@/lib/platform/services';
import { createS3Storage } from '@/lib/storage/s3';

/** Put a house together from its settings. `overrides` replace parts, for tests and the seed. */
export async function createServices(env: Env, overrides: Partial<Services> = {}): Promise<Services> {
  const database = overrides.database ?? (await openDatabase(env.DATABASE_URL, env.DATABASE_AUTH_TOKEN));
  return {
    database,
    read: database.read,
    write: database.write,
    storage: createS3Storage({
      endpoint: env.S3_ENDPOINT,
      publicEndpoint: env.S3_PUBLIC_ENDPOINT,
      region: env.S3_REGION,
      bucket: env.S3_BUCKET,
      accessKeyId: env.S3_ACCESS_KEY_ID,
      secretAccessKey: env.S3_SECRET_ACCESS_KEY,
      forcePathStyle: true,
    }),
    mail: createMail({ smtpUrl: env.SMTP_URL, folder: env.MAIL_DIR, from: env.MAIL_FROM }),
    clock: systemClock,
    log: createLog(env.LOG_LEVEL),
    env,
    secrets: createSecretBox(Buffer.from(env.BELLKEEP_SECRET_KEY, 'base64')),
    ...overrides,
  };
}

const shared = globalThis as { bellkeepServices?: Promise<Services> };

/** The services of this process. One set, whichever bundle asks. */
export function getServices(): Promise<Services> {
  shared.bellkeepServices ??= createServices(readEnv(process.env)).catch((error: unknown) => {
    delete shared.bellkeepServices;
    throw error;
  });
  return shared.bellkeepServices;
}

/** For tests: the services that routes find from now on. */
export function provideServices(services: Services): void {
  shared.bellkeepServices = Promise.resolve(services);
}
