import { parseArgs } from 'node:util';
import { SITE_IDS, type SiteId } from '@/lib/contract/sites';

export const HELP = `npm run device -- COMMAND --state FOLDER [options]

  enrol CODE        exchange the code of the enrolment sheet for a credential
                    --origin URL     address of the service (this time; afterwards the folder knows)
                    --serial NUMBER  serial number of the device (this time)
                    --key-type TYPE  Ed25519 (usual) or P-256
                    --firmware TEXT
  send FILE...      take recordings into the queue and send what waits; the same file is the same recording
                    --type MEDIA     media type, where the name does not tell it
                    --site ID        ${SITE_IDS.slice(0, 2).join(', ')}, ...
                    --side SIDE      bell or diaphragm
                    --identifier ID  a scanned wristband or encounter number
                    --later          only take them into the queue
  run               send what waits and say how the device is, until it is stopped
                    --every SECONDS  how often (30)
  heartbeat         say how the device is, hear the time
                    --battery PERCENT  --firmware TEXT
  renew             renew the credential
  status            what the state folder holds; asks nobody
                    --json           for programs
  retry [NUMBER]    put refused recordings in line again
  drop NUMBER       give a recording up that was not sent

  Ends with 0 when it is done, 1 when the service refused something, 2 when the command is not right, 3 when there was
  no answer (nothing is lost: try again), 4 when the state folder is in use or cannot be read.`;

/** The command is not right. */
export class WrongUse extends Error {}

export interface Arguments {
  command: string;
  rest: string[];
  state: string;
  origin: string | null;
  serial: string | null;
  keyType: 'Ed25519' | 'P-256';
  firmware: string | null;
  mediaType: string | null;
  site: SiteId | null;
  side: 'bell' | 'diaphragm' | null;
  identifier: string | null;
  later: boolean;
  everySeconds: number;
  batteryPercent: number | null;
  json: boolean;
}

const OPTIONS = {
  state: { type: 'string' },
  origin: { type: 'string' },
  serial: { type: 'string' },
  'key-type': { type: 'string' },
  firmware: { type: 'string' },
  type: { type: 'string' },
  site: { type: 'string' },
  side: { type: 'string' },
  identifier: { type: 'string' },
  later: { type: 'boolean' },
  every: { type: 'string' },
  battery: { type: 'string' },
  json: { type: 'boolean' },
  help: { type: 'boolean' },
} as const;

function oneOf<T extends string>(name: string, value: string | undefined, allowed: readonly T[]): T | null {
  if (value === undefined) return null;
  const found = allowed.find((word) => word === value);
  if (!found) throw new WrongUse(`--${name} is one of ${allowed.join(', ')}`);
  return found;
}

function number(name: string, value: string | undefined, low: number, high: number): number | null {
  if (value === undefined) return null;
  const read = Number(value);
  if (value.trim() === '' || !(read >= low && read <= high))
    throw new WrongUse(`--${name} is a number from ${low} to ${high}`);
  return read;
}

function originOf(value: string | undefined): string | null {
  if (value === undefined) return null;
  const url = URL.canParse(value) ? new URL(value) : null;
  if (!url || !['http:', 'https:'].includes(url.protocol) || url.pathname !== '/' || url.search)
    throw new WrongUse('--origin is an address such as https://bellkeep.example.org');
  return url.origin;
}

function parse(args: string[]) {
  try {
    return parseArgs({ args, allowPositionals: true, options: OPTIONS });
  } catch (error) {
    throw new WrongUse(error instanceof Error ? error.message : String(error));
  }
}

/** @returns null when help was asked for. @throws WrongUse */
export function readArguments(args: string[]): Arguments | null {
  const { values, positionals } = parse(args);
  if (values.help) return null;
  const [command, ...rest] = positionals;
  if (!command) throw new WrongUse('name a command');
  if (!values.state) throw new WrongUse('--state FOLDER is needed');
  return {
    command,
    rest,
    state: values.state,
    origin: originOf(values.origin),
    serial: values.serial ?? null,
    keyType: oneOf('key-type', values['key-type'], ['Ed25519', 'P-256']) ?? 'Ed25519',
    firmware: values.firmware ?? null,
    mediaType: values.type ?? null,
    site: oneOf('site', values.site, SITE_IDS),
    side: oneOf('side', values.side, ['bell', 'diaphragm']),
    identifier: values.identifier ?? null,
    later: values.later ?? false,
    everySeconds: number('every', values.every, 1, 86_400) ?? 30,
    batteryPercent: number('battery', values.battery, 0, 100),
    json: values.json ?? false,
  };
}
