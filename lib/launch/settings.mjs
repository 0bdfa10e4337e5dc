import { randomBytes } from 'node:crypto';
import { existsSync, mkdirSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';

/**
 * Settings of a house that runs on this machine alone: fresh secrets, kept in the data folder so that the next
 * start finds the same.
 */
export function localSettings({ folder, webPort, storagePort }) {
  mkdirSync(folder, { recursive: true });
  const path = join(folder, 'secrets.json');
  if (!existsSync(path)) {
    const secrets = {
      BELLKEEP_SECRET_KEY: randomBytes(32).toString('base64'),
      BELLKEEP_AUTH_SECRET: randomBytes(32).toString('hex'),
      S3_ACCESS_KEY_ID: `BELLKEEP${randomBytes(6).toString('hex').toUpperCase()}`,
      S3_SECRET_ACCESS_KEY: randomBytes(24).toString('base64url'),
    };
    writeFileSync(path, JSON.stringify(secrets, null, 2), { mode: 0o600 });
  }
  const secrets = JSON.parse(readFileSync(path, 'utf8'));
  return {
    ...secrets,
    // A name and not a number: browsers make passkeys for names only.
    BELLKEEP_ORIGIN: `http://localhost:${webPort}`,
    DATABASE_URL: `file:${join(folder, 'bellkeep.db')}`,
    S3_ENDPOINT: `http://127.0.0.1:${storagePort}`,
    S3_BUCKET: 'recordings',
    MAIL_DIR: join(folder, 'mail'),
    LOG_LEVEL: process.env.LOG_LEVEL ?? 'info',
  };
}

/** Arguments of node that start the storage fake with these settings. */
export const storageFakeArgs = (settings, folder) => [
  '--import',
  'tsx',
  'storage-fake/server.ts',
  '--port',
  new URL(settings.S3_ENDPOINT).port,
  '--dir',
  join(folder, 'objects'),
  '--access-key',
  settings.S3_ACCESS_KEY_ID,
  '--secret-key',
  settings.S3_SECRET_ACCESS_KEY,
  '--bucket',
  settings.S3_BUCKET,
];

export const webArgs = (port) => [
  'node_modules/next/dist/bin/next',
  'start',
  '-p',
  String(port),
  '-H',
  '127.0.0.1',
];
