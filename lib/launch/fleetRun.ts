import { mkdtemp, rm } from 'node:fs/promises';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import { isNotNull, sql } from 'drizzle-orm';
import { z } from 'zod';
import { applyMigrations } from '@/db/migrate';
import { recording } from '@/db/schema';
import type { FleetEvent } from '@/devices/fleet/events';
import { startFleet } from '@/devices/fleet/fleet';
import { FAULTS, type FleetDevice } from '@/devices/fleet/options';
import { SERVICE_ACTOR } from '@/lib/custody/entry';
import { issueEnrolmentCode } from '@/lib/enrolment/issueCode';
import { addDevice } from '@/lib/fleet/addDevice';
import { describeModel } from '@/lib/fleet/describeModel';
import { createServices } from '@/lib/http/services';
import { rotateSigningKey } from '@/lib/keys/changeSigningKey';
import { currentSigningKey } from '@/lib/keys/signingKeys';
import type { Authorized } from '@/lib/platform/authority';
import { readEnv } from '@/lib/platform/env';
import type { Services } from '@/lib/platform/services';
import { readRun } from '@/lib/rotation/readRuns';
import { startRun } from '@/lib/rotation/startRun';
import { freePort, Household, untilAnswers } from './processes.mjs';
import { localSettings, storageFakeArgs, webArgs } from './settings.mjs';

const HELP = `npm run fleet -- --rotate [--devices N] [--seed S] [--clips N] [--pace CLIPS] [--faults WORD]

  A house of its own on free ports; all credentials and the signing key rotate while the devices upload.
  --devices N   (1000)
  --clips N     at least so many a device (2)
  --pace CLIPS  clips a minute over the whole fleet (2400)
  --seed S      the same seed gives the same sounds, clocks and faults (1)
  --faults WORD none, usual or harsh (none)`;

const Settings = z.object({
  rotate: z.literal(true, 'say --rotate, or name a service with --origin'),
  devices: z.coerce.number().int().min(1).max(10_000).default(1000),
  clips: z.coerce.number().int().min(1).default(2),
  pace: z.coerce.number().positive().default(2400),
  seed: z.coerce.number().int().default(1),
  faults: z.enum(['none', 'usual', 'harsh']).default('none'),
});
type Settings = z.infer<typeof Settings>;

const CLIP_SECONDS = 5;
const RATE_HZ = 4000;
const LOOK_EVERY_MS = 1_000;
/** Whoever runs the command, in a house that is thrown away. */
const OPERATOR = {
  id: 'fleet-command',
  name: 'The fleet command',
  email: '',
  jobTitle: null,
  roles: ['itadmin'],
  wardIds: [],
  sessionId: '',
} as unknown as Authorized<'credential.write'> & Authorized<'credential.read'>;

const pause = (milliseconds: number) => new Promise((resolve) => setTimeout(resolve, milliseconds));

function readSettings(): Settings | null {
  const text = { type: 'string' } as const;
  try {
    const { values } = parseArgs({
      options: {
        rotate: { type: 'boolean' },
        devices: text,
        clips: text,
        pace: text,
        seed: text,
        faults: text,
      },
    });
    return Settings.parse(values);
  } catch (error) {
    console.error(`${error instanceof z.ZodError ? z.prettifyError(error) : error}\n\n${HELP}`);
    return null;
  }
}

/** The devices of the fleet, on the list and with a code each. */
async function listDevices(services: Services, count: number): Promise<FleetDevice[]> {
  const modelId = await describeModel(services, SERVICE_ACTOR, {
    maker: 'Any',
    name: 'Any model',
    sampleRatesHz: [],
    bitDepths: [],
    mediaTypes: ['audio/wav'],
    allowLossy: false,
    longestClipSeconds: 600,
    fullScaleNote: null,
    checkIntervalDays: 365,
    signsRequests: true,
  });
  const devices: FleetDevice[] = [];
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
    devices.push({ serialNumber, code, sampleRateHz: RATE_HZ });
  }
  return devices;
}

/** What the devices did, as they tell it. */
class Tally {
  readonly recorded = new Set<string>();
  readonly sent = new Set<string>();
  enrolled = 0;
  refused = 0;
  readonly refusals: string[] = [];

  readonly take = (event: FleetEvent): void => {
    if (event.kind === 'enrolled') this.enrolled++;
    if (event.kind === 'recorded') this.recorded.add(`${event.serialNumber} ${event.recordingNumber}`);
    if (event.kind === 'sent') this.sent.add(`${event.serialNumber} ${event.recordingNumber}`);
    if (event.kind === 'refused') {
      this.refused++;
      if (this.refusals.length < 5)
        this.refusals.push(`${event.serialNumber} ${event.recordingNumber ?? ''}: ${event.code}`);
    }
  };
}

/** Recordings that are whole at the service, and how many of them are there more than once. */
async function arrived(services: Services): Promise<{ whole: number; duplicated: number }> {
  const [row] = await services.read
    .select({
      whole: sql<number>`count(*)`,
      different: sql<number>`count(distinct ${recording.deviceId} || ' ' || ${recording.declaredSha256})`,
    })
    .from(recording)
    .where(isNotNull(recording.measuredAt));
  const { whole = 0, different = 0 } = row ?? {};
  return { whole, duplicated: whole - different };
}

async function rotateWhileUploading(services: Services, settings: Settings, origin: string): Promise<number> {
  const devices = await listDevices(services, settings.devices);
  const tally = new Tally();
  let runId: string | null = null;
  let over = false;
  const began = performance.now();
  const meanMs = (settings.devices * 60_000) / settings.pace;
  const fleet = startFleet({
    origin,
    devices,
    seed: settings.seed,
    pace: settings.pace,
    clipsEach: settings.clips,
    clipSeconds: CLIP_SECONDS,
    faults: FAULTS[settings.faults],
    stateFolder: null,
    heartbeatEveryMs: meanMs / 4,
    enough: () => over,
    onEvent: tally.take,
  });
  const rotation = (async () => {
    while (tally.enrolled < settings.devices) await pause(LOOK_EVERY_MS);
    const key = await currentSigningKey(services, 'device-token');
    const run = await startRun(services, OPERATOR, {
      selection: { wardId: null, modelId: null, firmware: null, endingBefore: null },
      waveSize: Math.max(1, Math.ceil(settings.devices / 4)),
      wavePauseMinutes: 0,
      deadlineHours: 24,
      atDeadline: 'keep',
      reason: 'rotation while uploading',
    });
    runId = run.id;
    // Half of the credentials are renewed under the old key, half under the new one.
    const { counts } = await untilRun(services, run.id, ({ done }) => done * 2 >= settings.devices);
    await rotateSigningKey(services, OPERATOR, { kid: key.kid, reason: 'rotation while uploading' });
    console.log(`signing key rotated when ${counts.done} of ${settings.devices} credentials were renewed`);
    await untilRun(services, run.id, ({ waiting, asked }) => waiting + asked === 0);
    over = true;
  })();
  await Promise.all([fleet.ended, rotation]);
  const seconds = (performance.now() - began) / 1000;
  return await report(services, tally, settings, runId ?? '', seconds);
}

async function untilRun(
  services: Services,
  id: string,
  reached: (counts: Awaited<ReturnType<typeof readRun>>['run']['counts']) => boolean,
) {
  for (;;) {
    const { run } = await readRun(services, OPERATOR, id, { view: 'stragglers' });
    if (reached(run.counts)) return run;
    await pause(LOOK_EVERY_MS);
  }
}

async function report(
  services: Services,
  tally: Tally,
  settings: Settings,
  runId: string,
  seconds: number,
): Promise<number> {
  const { whole, duplicated } = await arrived(services);
  const lost = [...tally.recorded].filter((clip) => !tally.sent.has(clip)).length;
  const missing = Math.max(0, tally.recorded.size - whole);
  const { run } = await readRun(services, OPERATOR, runId, { view: 'done' });
  const rotated = run.counts.done;
  console.log(
    `devices = ${settings.devices}, credentials rotated = ${rotated}, clips = ${tally.recorded.size}`,
  );
  console.log(
    `lost = ${Math.max(lost, missing)}, duplicated = ${duplicated}, refused = ${tally.refused}, rate = ${(tally.sent.size / seconds).toFixed(1)} clips a second`,
  );
  for (const refusal of tally.refusals) console.log(`refused: ${refusal}`);
  const right = lost + missing + duplicated + tally.refused === 0 && rotated === settings.devices;
  return right ? 0 : 1;
}

async function main(settings: Settings): Promise<number> {
  const folder = await mkdtemp(join(tmpdir(), 'bellkeep-fleet-'));
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
    const code = await rotateWhileUploading(services, settings, env.BELLKEEP_ORIGIN);
    services.database.close();
    return code;
  } finally {
    await stop();
  }
}

const settings = readSettings();
process.exit(
  settings
    ? await main(settings).catch((error: unknown) => {
        console.error(error instanceof Error ? error.message : error);
        return 1;
      })
    : 2,
);
