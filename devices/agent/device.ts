import { mkdir, open, readFile, rename } from 'node:fs/promises';
import { dirname, join } from 'node:path';
import type { JWK } from 'jose';
import type { CredentialAnswer } from '@/lib/contract/device';
import { createApi, type ServiceApi } from './api';
import type { DeviceClock } from './clock';
import { type DeviceKeys, type KeyType, loadKeys, makeKeys } from './keys';

/** What a device keeps between two power cuts. */
interface State {
  serialNumber: string;
  privateJwk: JWK;
  credential: CredentialAnswer | null;
  /** The credential before: kept until the new one was used once. */
  previous: CredentialAnswer | null;
}

export interface DeviceOptions {
  /** Address of the service, without a trailing slash. */
  origin: string;
  serialNumber: string;
  /** Where keys and credential are kept; null: in memory only. */
  stateFolder: string | null;
  clock?: DeviceClock;
  keyType?: KeyType;
  fetch?: typeof fetch;
  sleep?: (milliseconds: number) => Promise<void>;
  random?: () => number;
}

export interface Device {
  readonly origin: string;
  readonly serialNumber: string;
  readonly keys: DeviceKeys;
  readonly clock: DeviceClock;
  readonly api: ServiceApi;
  readonly fetch: typeof fetch;
  readonly sleep: (milliseconds: number) => Promise<void>;
  readonly random: () => number;
  readonly credential: CredentialAnswer | null;
  /** Store a new credential durably before it is used; the old one is kept beside it. */
  keepCredential(answer: CredentialAnswer): Promise<void>;
  /** Call the service with the credential. @throws ServiceProblem, NoAnswer */
  call<T>(path: string, body: unknown): Promise<T>;
}

/** Write a file so that a power cut leaves the old or the new one, never half of either. */
export async function writeDurably(path: string, bytes: Uint8Array | string, mode = 0o600): Promise<void> {
  const folder = dirname(path);
  await mkdir(folder, { recursive: true });
  const fresh = `${path}.new`;
  const file = await open(fresh, 'w', mode);
  try {
    await file.writeFile(bytes);
    await file.sync();
  } finally {
    await file.close();
  }
  await rename(fresh, path);
  await syncFolder(folder);
}

/** The name is durable only once its folder is. */
export async function syncFolder(folder: string): Promise<void> {
  const handle = await open(folder, 'r');
  try {
    await handle.sync();
  } finally {
    await handle.close();
  }
}

async function readState(path: string | null): Promise<State | null> {
  if (path === null) return null;
  try {
    return JSON.parse(await readFile(path, 'utf8')) as State;
  } catch (error) {
    if ((error as NodeJS.ErrnoException).code === 'ENOENT') return null;
    throw error;
  }
}

/** Wake a device up: with the keys and credential of its state folder, or with a fresh key pair. */
export async function createDevice(options: DeviceOptions): Promise<Device> {
  const path = options.stateFolder === null ? null : join(options.stateFolder, 'device.json');
  let state = await readState(path);
  const keys = state ? await loadKeys(state.privateJwk) : await makeKeys(options.keyType);
  if (!state) {
    state = {
      serialNumber: options.serialNumber,
      privateJwk: keys.privateJwk,
      credential: null,
      previous: null,
    };
    if (path) await writeDurably(path, JSON.stringify(state));
  }
  let current: State = state;
  const clock = options.clock ?? { now: () => Date.now() };
  const send = options.fetch ?? fetch;
  const api = createApi({ origin: options.origin, clock, fetch: send });
  return {
    origin: options.origin,
    serialNumber: options.serialNumber,
    keys,
    clock,
    api,
    fetch: send,
    sleep: options.sleep ?? ((milliseconds) => new Promise((resolve) => setTimeout(resolve, milliseconds))),
    random: options.random ?? Math.random,
    get credential() {
      return current.credential;
    },
    async keepCredential(answer) {
      current = { ...current, previous: current.credential, credential: answer };
      if (path) await writeDurably(path, JSON.stringify(current));
    },
    async call(path, body) {
      if (!current.credential) throw new Error('this device is not enrolled');
      return await api.call(path, body, { keys, credential: current.credential });
    },
  };
}
