import { mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { applyMigrations } from '@/db/migrate';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { issueEnrolmentCode } from '@/lib/enrolment/issueCode';
import { addDevice } from '@/lib/fleet/addDevice';
import { describeModel } from '@/lib/fleet/describeModel';
import { createServices } from '@/lib/http/services';
import { readEnv } from '@/lib/platform/env';
import type { Services } from '@/lib/platform/services';
import { freePort, Household, untilAnswers } from './processes.mjs';
import { localSettings, storageFakeArgs, webArgs } from './settings.mjs';

export interface TemporaryHouse {
  origin: string;
  /** A second hand on the same database and store, beside the web server. */
  services: Services;
}

/**
 * Start everything on free ports with a temporary folder, do something, stop everything. Needs a production build.
 *
 * @param name of the folder
 */
export async function withTemporaryHouse<T>(
  name: string,
  work: (house: TemporaryHouse) => Promise<T>,
): Promise<T> {
  const folder = await mkdtemp(join(tmpdir(), `bellkeep-${name}-`));
  const household = new Household();
  const stop = async () => {
    await household.stop();
    await rm(folder, { recursive: true, force: true });
  };
  for (const signal of ['SIGINT', 'SIGTERM'] as const)
    process.on(signal, () => void stop().then(() => process.exit(130)));
  try {
    const ports = { webPort: await freePort(), storagePort: await freePort() };
    const env = {
      ...localSettings({ folder, ...ports }),
      LOG_LEVEL: 'warn',
      DEVICE_REQUESTS_PER_MINUTE: '100000',
    };
    const storage = household.start('the storage fake', storageFakeArgs(env, folder));
    const services = await createServices(readEnv({ ...env, LOG_LEVEL: 'silent' }));
    await applyMigrations(services.database);
    await untilAnswers(`${env.S3_ENDPOINT}`, storage);
    const web = household.start('the web server', webArgs(ports.webPort), {
      env: { ...env, NODE_ENV: 'production' },
    });
    await untilAnswers(`${env.BELLKEEP_ORIGIN}/api/health`, web);
    const answer = await work({ origin: env.BELLKEEP_ORIGIN, services });
    services.database.close();
    return answer;
  } finally {
    await stop();
  }
}

/** Devices of one model that takes anything, on the list and with a code each. */
export async function listDevices(
  services: Services,
  count: number,
): Promise<{ serialNumber: string; code: string }[]> {
  const modelId = await describeModel(services, SERVICE_ACTOR, {
    maker: 'Any',
    name: 'Any model',
    sampleRatesHz: [],
    bitDepths: [],
    mediaTypes: ['audio/wav'],
    allowLossy: false,
    longestClipSeconds: 86_400,
    fullScaleNote: null,
    checkIntervalDays: 365,
    signsRequests: true,
  });
  const devices = [];
  for (let i = 1; i <= count; i++) {
    const serialNumber = `FLEET-${i}`;
    const deviceId = await addDevice(services, SERVICE_ACTOR, {
      assetTag: `F-${String(i).padStart(5, '0')}`,
      serialNumber,
      modelId,
      wardId: null,
      udi: null,
      lot: null,
      firmware: null,
    });
    const { code } = await issueEnrolmentCode(services, SERVICE_ACTOR, deviceId);
    devices.push({ serialNumber, code });
  }
  return devices;
}
