import { CredentialAnswer } from '@/lib/contract/device';
import { ServiceProblem, understood } from './answers';
import { createApi, type ServiceApi } from './api';
import type { DeviceClock } from './clock';
import { type Disk, folderDisk, memoryDisk } from './disk';
import { type DeviceKeys, type KeyType, loadKeys, makeKeys } from './keys';
import { readState, type State, StateUnreadable, writeState } from './state';

export interface DeviceOptions {
  /** Address of the service, without a trailing slash. */
  origin: string;
  serialNumber: string;
  /** Where keys, credential and queue are kept; null: in memory only. One process at a time (see hold.ts). */
  stateFolder: string | null;
  /** In place of the state folder. */
  disk?: Disk;
  clock?: DeviceClock;
  keyType?: KeyType;
  fetch?: typeof fetch;
  sleep?: (milliseconds: number) => Promise<void>;
  random?: () => number;
  /** How long one call of the service may take. */
  timeoutMs?: number;
}

export interface Device {
  readonly origin: string;
  readonly serialNumber: string;
  readonly keys: DeviceKeys;
  readonly clock: DeviceClock;
  readonly disk: Disk;
  readonly api: ServiceApi;
  readonly fetch: typeof fetch;
  readonly sleep: (milliseconds: number) => Promise<void>;
  readonly random: () => number;
  readonly credential: CredentialAnswer | null;
  /** Keep the first credential of an enrolment. Those before it are of no more use. */
  adoptCredential(answer: CredentialAnswer): Promise<void>;
  /** Keep a renewed credential durably before it is used; the old one is kept beside it until then. */
  keepCredential(answer: CredentialAnswer): Promise<void>;
  /** Call the service with the credential. @throws ServiceProblem, NoAnswer */
  call<T>(path: string, body: unknown): Promise<T>;
}

async function wakeState(options: DeviceOptions, disk: Disk): Promise<{ state: State; keys: DeviceKeys }> {
  await disk.sweep('.');
  const found = await readState(disk);
  if (found) {
    if (found.serialNumber !== options.serialNumber)
      throw new StateUnreadable(
        `The state is that of ${found.serialNumber}, not of ${options.serialNumber}.`,
      );
    const elsewhere = found.origin !== undefined && found.origin !== options.origin;
    return {
      state: elsewhere ? { ...found, credential: null, previous: null } : found,
      keys: await loadKeys(found.privateJwk),
    };
  }
  const keys = await makeKeys(options.keyType);
  const state: State = {
    serialNumber: options.serialNumber,
    privateJwk: keys.privateJwk,
    credential: null,
    previous: null,
  };
  // Durable before it is used: a code that was exchanged for a lost key is a device that must go back to the bench.
  await writeState(disk, state);
  return { state, keys };
}

export const RENEW_PATH = '/api/device/v1/token';

/** Whether the service let the credential in, whatever it said to the call. */
const wasTaken = (error: unknown): boolean =>
  error instanceof ServiceProblem && error.status < 500 && ![401, 429].includes(error.status);

/** Wake a device up: with the keys and credential of its state, or with a fresh key pair. @throws StateUnreadable */
export async function createDevice(options: DeviceOptions): Promise<Device> {
  const disk =
    options.disk ?? (options.stateFolder === null ? memoryDisk() : folderDisk(options.stateFolder));
  const { state, keys } = await wakeState(options, disk);
  const clock = options.clock ?? { now: () => Date.now() };
  const send = options.fetch ?? fetch;
  const api = createApi({
    origin: options.origin,
    clock,
    fetch: send,
    ...(options.timeoutMs === undefined ? {} : { timeoutMs: options.timeoutMs }),
  });
  const held = holdCredential(options.origin, disk, state, keys, api);
  return {
    origin: options.origin,
    serialNumber: options.serialNumber,
    keys,
    clock,
    disk,
    api,
    fetch: send,
    sleep: options.sleep ?? ((milliseconds) => new Promise((resolve) => setTimeout(resolve, milliseconds))),
    random: options.random ?? Math.random,
    get credential() {
      return held.credential;
    },
    adoptCredential: held.adoptCredential,
    keepCredential: held.keepCredential,
    call: held.call,
  };
}

type Held = Pick<Device, 'credential' | 'adoptCredential' | 'keepCredential' | 'call'>;

function holdCredential(origin: string, disk: Disk, woken: State, keys: DeviceKeys, api: ServiceApi): Held {
  let state = woken;
  const keep = async (credential: CredentialAnswer | null, previous: CredentialAnswer | null) => {
    const next = { ...state, origin, credential, previous };
    await writeState(disk, next);
    state = next;
  };
  return {
    get credential() {
      return state.credential;
    },
    adoptCredential: (answer) => keep(answer, null),
    async keepCredential(answer) {
      const same = answer.credentialId === state.credential?.credentialId;
      await keep(answer, same ? state.previous : state.credential);
    },
    async call<T>(path: string, body: unknown): Promise<T> {
      const { credential, previous } = state;
      if (!credential) throw new Error('this device is not enrolled');
      try {
        const answer = await api.call<T>(path, body, { keys, credential });
        if (previous !== null && state.previous === previous) await keep(state.credential, null);
        return answer;
      } catch (error) {
        if (error instanceof ServiceProblem && error.code === 'renewal-needed' && path !== RENEW_PATH) {
          // The service trusts the key no more that signed this credential; ours still speaks for us.
          const renewed = understood(CredentialAnswer, await api.call(RENEW_PATH, {}, { keys, credential }));
          await keep(renewed, credential);
          return await api.call<T>(path, body, { keys, credential: renewed });
        }
        if (previous === null || state.previous !== previous) throw error;
        if (wasTaken(error)) await keep(state.credential, null);
        if (!(error instanceof ServiceProblem) || error.code !== 'token-invalid') throw error;
        // The service does not know the new credential, as after a restore of yesterday's database: the one before
        // was never retired by it. Tried once, because a retired one that is used again is an alarm.
        await keep(previous, null);
        return await api.call<T>(path, body, { keys, credential: previous });
      }
    },
  };
}
