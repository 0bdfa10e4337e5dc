import { createServer, type Server } from 'node:http';
import type { AddressInfo } from 'node:net';
import { pathToFileURL } from 'node:url';
import { parseArgs } from 'node:util';
import { type Backdoor, openBackdoor } from './backdoor';
import type { Behaviour } from './exchange';
import { Faults } from './faults';
import { handle } from './handle';
import { ObjectStore } from './objects';

export type { Backdoor } from './backdoor';
export type { FaultRule, Faults } from './faults';

export interface StorageFakeOptions {
  /** Where the objects are kept. One running fake a directory. */
  dir: string;
  accessKey: string;
  secretKey: string;
  /** Buckets that are there from the start, with object lock unless `noObjectLock`. */
  bucket: string | readonly string[];
  /** 0 or left out: any free port. */
  port?: number;
  host?: string;
  region?: string;
  /** Names below which a bucket may stand in the Host header; `localhost` by default. */
  domains?: readonly string[];
  /** UTC milliseconds. */
  nowMs?: () => number;
  ignoreSignedChecksum?: boolean;
  refuseStreamedTrailers?: boolean;
  ignoreWriteConditions?: boolean;
  /** true: buckets without a lock configuration (400 InvalidRequest). 'not-implemented': a store without locks (501). */
  noObjectLock?: boolean | 'not-implemented';
  /** Switch faults over HTTP at `/-/faults`, without credentials. */
  faultsOverHttp?: boolean;
  /** Origins whose pages may read answers; any by default. */
  allowedOrigins?: readonly string[];
}

export interface StorageFake {
  url: string;
  port: number;
  faults: Faults;
  backdoor: Backdoor;
  /** Stop listening, cut what is open, and return once nothing runs any more. */
  close(): Promise<void>;
}

/** Start the fake in this process. */
export async function startStorageFake(options: StorageFakeOptions): Promise<StorageFake> {
  const { host = '127.0.0.1', region = 'us-east-1', nowMs = Date.now, noObjectLock = false } = options;
  const store = await ObjectStore.open(options.dir);
  for (const name of [options.bucket].flat()) {
    if (store.find(name) === undefined) {
      await store.createBucket({ name, createdMs: nowMs(), objectLock: noObjectLock === false });
    }
  }
  const behaviour: Behaviour = {
    ignoreSignedChecksum: options.ignoreSignedChecksum ?? false,
    refuseStreamedTrailers: options.refuseStreamedTrailers ?? false,
    ignoreWriteConditions: options.ignoreWriteConditions ?? false,
    objectLock: noObjectLock === false ? 'present' : noObjectLock === true ? 'absent' : 'unknown',
    allowedOrigins: options.allowedOrigins ?? ['*'],
    region,
  };
  const faults = new Faults();
  const handling = {
    store,
    credentials: { accessKey: options.accessKey, secretKey: options.secretKey, region },
    behaviour,
    faults,
    faultsOverHttp: options.faultsOverHttp ?? false,
    domains: options.domains ?? ['localhost'],
    nowMs,
  };
  const running = new Set<Promise<void>>();
  const track = (work: Promise<void>): void => {
    running.add(work);
    void work.finally(() => running.delete(work));
  };
  // No limit on how long a body may take: a slow link is not an error of the store.
  const server = createServer({ requestTimeout: 0, keepAliveTimeout: 75_000 });
  server.on('request', (message, response) => track(handle(handling, message, response, false)));
  server.on('checkContinue', (message, response) => track(handle(handling, message, response, true)));
  await listen(server, options.port ?? 0, host);
  const { port } = server.address() as AddressInfo;
  return {
    url: `http://${host.includes(':') ? `[${host}]` : host}:${port}`,
    port,
    faults,
    backdoor: openBackdoor(store),
    async close() {
      const closed = new Promise<void>((resolve) => server.close(() => resolve()));
      server.closeAllConnections();
      await closed;
      await Promise.allSettled(running);
    },
  };
}

function listen(server: Server, port: number, host: string): Promise<void> {
  return new Promise((resolve, reject) => {
    server.once('error', reject);
    server.listen(port, host, () => {
      server.off('error', reject);
      resolve();
    });
  });
}

const USAGE = `storage-fake --port N --dir D --access-key K --secret-key S --bucket B [--bucket B2 ...]
  [--host 127.0.0.1] [--region us-east-1] [--domain D ...] [--faults] [--allow-origin O ...]
  [--ignore-signed-checksum] [--refuse-streamed-trailers] [--ignore-write-conditions] [--no-object-lock]`;

async function main(): Promise<void> {
  const { values } = parseArgs({
    options: {
      port: { type: 'string' },
      dir: { type: 'string' },
      'access-key': { type: 'string' },
      'secret-key': { type: 'string' },
      bucket: { type: 'string', multiple: true },
      host: { type: 'string' },
      region: { type: 'string' },
      domain: { type: 'string', multiple: true },
      faults: { type: 'boolean' },
      'allow-origin': { type: 'string', multiple: true },
      'ignore-signed-checksum': { type: 'boolean' },
      'refuse-streamed-trailers': { type: 'boolean' },
      'ignore-write-conditions': { type: 'boolean' },
      'no-object-lock': { type: 'boolean' },
    },
  });
  const { dir, bucket, 'access-key': accessKey, 'secret-key': secretKey } = values;
  const port = Number(values.port);
  if (!dir || !bucket || !accessKey || !secretKey || !Number.isInteger(port) || port < 0 || port > 65_535)
    throw new Error(USAGE);
  const fake = await startStorageFake({
    dir,
    bucket,
    accessKey,
    secretKey,
    port,
    ...(values.host ? { host: values.host } : {}),
    ...(values.region ? { region: values.region } : {}),
    ...(values.domain ? { domains: values.domain } : {}),
    ...(values['allow-origin'] ? { allowedOrigins: values['allow-origin'] } : {}),
    faultsOverHttp: values.faults ?? false,
    ignoreSignedChecksum: values['ignore-signed-checksum'] ?? false,
    refuseStreamedTrailers: values['refuse-streamed-trailers'] ?? false,
    ignoreWriteConditions: values['ignore-write-conditions'] ?? false,
    noObjectLock: values['no-object-lock'] ?? false,
  });
  const stop = (): void => {
    void fake.close().then(() => process.exit(0));
  };
  process.once('SIGTERM', stop);
  process.once('SIGINT', stop);
  console.log(`storage fake listening on ${fake.url}`);
}

if (process.argv[1] !== undefined && import.meta.url === pathToFileURL(process.argv[1]).href) {
  main().catch((error: unknown) => {
    console.error(error instanceof Error ? error.message : error);
    process.exit(2);
  });
}
