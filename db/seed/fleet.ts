import { writeFileSync } from 'node:fs';
import { readFile } from 'node:fs/promises';
import { dirname, join } from 'node:path';
import { and, asc, eq } from 'drizzle-orm';
import { decodeJwt } from 'jose';
import { device, deviceModel } from '@/db/schema';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { issueEnrolmentCode } from '@/lib/enrolment/issueCode';
import { createServices } from '@/lib/http/services';
import { readEnv } from '@/lib/platform/env';

/** How many of the house's devices are alive in the demo. */
const ALIVE = 12;

/** Whether a device of the fleet holds a credential of this very address. */
async function holdsCredential(path: string): Promise<boolean> {
  const text = await readFile(path, 'utf8').catch(() => null);
  if (text === null) return false;
  const { credential } = JSON.parse(text) as { credential: { token: string } | null };
  return credential !== null && decodeJwt(credential.token).iss === env.BELLKEEP_ORIGIN;
}

/** Codes for the devices that the simulated fleet plays. One that holds a credential from an earlier start needs none. */
const env = readEnv({ ...process.env, LOG_LEVEL: 'warn' });
const folder = dirname(env.DATABASE_URL.replace(/^file:/, ''));
const services = await createServices(env);
const rows = await services.read
  .select({ device, rates: deviceModel.sampleRatesHz })
  .from(device)
  .innerJoin(deviceModel, eq(deviceModel.id, device.modelId))
  .where(and(eq(device.state, 'in-service'), eq(deviceModel.signsRequests, true)))
  .orderBy(asc(device.assetTag))
  .limit(ALIVE);
const codes = [];
for (const row of rows) {
  const known = await holdsCredential(
    join(folder, 'fleet', row.device.serialNumber.replace(/[^\w.-]/g, '_'), 'device.json'),
  );
  const code = known ? null : (await issueEnrolmentCode(services, SERVICE_ACTOR, row.device.id)).code;
  codes.push({
    serialNumber: row.device.serialNumber,
    code,
    sampleRateHz: row.rates[0] ?? 4000,
    firmware: row.device.firmware ?? '1.0.0',
  });
}
services.database.close();
writeFileSync(join(folder, 'fleet-codes.json'), JSON.stringify(codes, null, 1), { mode: 0o600 });
