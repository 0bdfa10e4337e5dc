import { parseArgs } from 'node:util';
import { isNotNull, sql } from 'drizzle-orm';
import { z } from 'zod';
import { recording } from '@/db/schema';
import type { FleetEvent } from '@/devices/fleet/events';
import { startFleet } from '@/devices/fleet/fleet';
import { FAULTS, type FleetDevice } from '@/devices/fleet/options';
import { rotateSigningKey } from '@/lib/keys/changeSigningKey';
import { currentSigningKey } from '@/lib/keys/signingKeys';
import type { Authorized } from '@/lib/platform/authority';
import type { Services } from '@/lib/platform/services';
import { readRun } from '@/lib/rotation/readRuns';
import { startRun } from '@/lib/rotation/startRun';
import { listDevices, withTemporaryHouse } from './temporaryHouse';

const HELP = `npm run fleet -- --rotate [--devices N] [--seed S] [--clips N] [--pace CLIPS] [--faults WORD]

  A house of its own on free ports; all credentials and the signing key rotate while the devices upload.
  --devices N   (1000)
  --clips N     at least so many a device (2)
  --pace CLIPS  clips a minute over the whole fleet (1200)
  --seed S      the same seed gives the same sounds, clocks and faults (1)
  --faults WORD none, usual or harsh (none)`;

const Settings = z.object({
  rotate: z.literal(true, 'say --rotate, or name a service with --origin'),
  devices: z.coerce.number().int().min(1).max(10_000).default(1000),
  clips: z.coerce.number().int().min(1).default(2),
  pace: z.coerce.number().positive().default(1200),
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
  const listed = await listDevices(services, settings.devices);
  const devices: FleetDevice[] = listed.map((device) => ({ ...device, sampleRateHz: RATE_HZ }));
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

const settings = readSettings();
process.exit(
  settings
    ? await withTemporaryHouse('fleet', ({ services, origin }) =>
        rotateWhileUploading(services, settings, origin),
      ).catch((error: unknown) => {
        console.error(error instanceof Error ? error.message : error);
        return 1;
      })
    : 2,
);
