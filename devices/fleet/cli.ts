import { readFileSync } from 'node:fs';
import { parseArgs } from 'node:util';
import { z } from 'zod';
import { holdFolder } from '../agent/hold';
import { eventText, type FleetEvent } from './events';
import { startFleet } from './fleet';
import { FAULTS } from './options';

const HELP = `npm run fleet -- --origin URL --codes FILE [options]
npm run fleet -- --rotate [--devices N] [--seed S] [--faults WORD]   a house of its own, whose credentials and signing
                    key rotate while the fleet uploads

  --origin URL      address of the service
  --codes FILE      JSON: [{ "serialNumber", "code", "sampleRateHz", "firmware" }]; without a code where the state
                    folder has a credential, 4000 Hz where no rate is said
  --state FOLDER    where the devices keep keys, credentials and queues (in memory)
  --devices N       only the first N of the file
  --pace CLIPS      clips a minute over the whole fleet (4)
  --minutes M       end after so long (runs until it is stopped)
  --clips N         end when each device has sent so many
  --seed S          the same seed gives the same sounds, clocks and faults (1)
  --faults WORD     none, usual or harsh: network, clocks, loss of power (usual)`;

const Codes = z.array(
  z.object({
    serialNumber: z.string().min(1),
    code: z.string().nullish(),
    sampleRateHz: z.number().min(500).max(192_000).optional(),
    firmware: z.string().optional(),
  }),
);

const count = z.coerce.number().positive();
const Settings = z.object({
  origin: z.url({ protocol: /^https?$/ }).transform((address) => address.replace(/\/+$/, '')),
  codes: z.string().transform((file, context) => {
    try {
      return Codes.parse(JSON.parse(readFileSync(file, 'utf8')));
    } catch (error) {
      context.addIssue(`${file}: ${error instanceof z.ZodError ? z.prettifyError(error) : error}`);
      return z.NEVER;
    }
  }),
  state: z.string().optional(),
  devices: count.int().optional(),
  pace: count.default(4),
  minutes: count.optional(),
  clips: count.int().optional(),
  seed: z.coerce.number().int().default(1),
  faults: z.enum(['none', 'usual', 'harsh']).default('usual'),
});

function readSettings(): z.infer<typeof Settings> | null {
  const text = { type: 'string' } as const;
  const names = ['origin', 'codes', 'state', 'devices', 'pace', 'minutes', 'clips', 'seed', 'faults'];
  try {
    const { values } = parseArgs({
      options: { ...Object.fromEntries(names.map((name) => [name, text])), help: { type: 'boolean' } },
    });
    if (values.help) {
      console.log(HELP);
      return null;
    }
    return Settings.parse(values);
  } catch (error) {
    console.error(`${error instanceof z.ZodError ? z.prettifyError(error) : error}\n\n${HELP}`);
    process.exitCode = 2;
    return null;
  }
}

async function main(settings: z.infer<typeof Settings>): Promise<void> {
  const letGo = settings.state === undefined ? null : await holdFolder(settings.state);
  const counts: Partial<Record<FleetEvent['kind'], number>> = {};
  const fleet = startFleet({
    origin: settings.origin,
    devices: settings.codes.slice(0, settings.devices),
    seed: settings.seed,
    pace: settings.pace,
    ...(settings.clips === undefined ? {} : { clipsEach: settings.clips }),
    faults: FAULTS[settings.faults],
    stateFolder: settings.state ?? null,
    onEvent(event) {
      counts[event.kind] = (counts[event.kind] ?? 0) + 1;
      console.log(`${new Date().toISOString()} ${eventText(event)}`);
    },
  });
  const stop = () => void fleet.stop();
  for (const signal of ['SIGINT', 'SIGTERM'] as const) process.on(signal, stop);
  const end = settings.minutes === undefined ? undefined : setTimeout(stop, settings.minutes * 60_000);
  try {
    await fleet.ended;
  } finally {
    clearTimeout(end);
    await letGo?.();
  }
  console.log(
    Object.entries(counts)
      .map(([kind, times]) => `${times} ${kind}`)
      .join(', ') || 'nothing happened',
  );
}

const settings = readSettings();
if (settings) await main(settings);
