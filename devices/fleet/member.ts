import { join } from 'node:path';
import { SITE_IDS } from '@/lib/contract/sites';
import { NoAnswer, ServiceProblem } from '../agent/answers';
import type { Clip } from '../agent/clip';
import { type DeviceClock, deviceTime, type SettableClock, settableClock } from '../agent/clock';
import { createDevice, type Device } from '../agent/device';
import { type Disk, folderDisk, memoryDisk } from '../agent/disk';
import { drainQueue, isWaiting, type QueueEvent } from '../agent/drain';
import { enrol } from '../agent/enrol';
import { heartbeat } from '../agent/heartbeat';
import { thumbprintOf } from '../agent/keys';
import { openQueue, type Queue } from '../agent/queue';
import { isPassing } from '../agent/retry';
import { synthesise } from '../synth/chest';
import { recipeOf, usualRecipe } from '../synth/recipes';
import { encodeWav } from '../synth/wav';
import { chanceOf } from './chance';
import type { FleetEvent } from './events';
import { beginLife, type Life, PowerLost } from './life';
import { faultyFetch } from './network';
import { FAULTS, type FleetDevice, type FleetFaults, type FleetOptions } from './options';

const HEARTBEAT_EVERY_MS = 60_000;
const DAY_MS = 86_400_000;
/** A device that may not send keeps recording only so far. */
const MOST_WAITING = 20;
/** Steps of disk and network that one clip takes, roughly: the power goes anywhere among them. */
const STEPS_OF_A_CLIP = 90;

/** One woken device, until it loses its power. */
interface Awake {
  life: Life;
  device: Device;
  queue: Queue;
}

type MemberEvent = FleetEvent extends infer E
  ? E extends FleetEvent
    ? Omit<E, 'serialNumber'>
    : never
  : never;

/** One device of the fleet over all its lives. */
export class Member {
  readonly #options: FleetOptions;
  readonly #facts: FleetDevice;
  readonly #faults: FleetFaults;
  readonly #stopping: AbortSignal;
  readonly #base: DeviceClock;
  readonly #clock: SettableClock;
  readonly #network: () => number;
  readonly #retries: () => number;
  readonly #memory: Disk | null;
  #awake: Awake | null = null;
  #lives = 0;
  #lastHeartbeat = Number.NEGATIVE_INFINITY;
  #codeLeft: string | null;
  #mustEnrol = false;
  #recorded = 0;

  constructor(options: FleetOptions, facts: FleetDevice, stopping: AbortSignal) {
    this.#options = options;
    this.#facts = facts;
    this.#faults = options.faults ?? FAULTS.usual;
    this.#stopping = stopping;
    this.#base = options.clock ?? { now: () => Date.now() };
    this.#clock = firstClock(this.#chance('clock'), this.#faults.clocks.yearsOff, this.#base);
    this.#network = this.#chance('network');
    this.#retries = this.#chance('retries');
    this.#memory = options.stateFolder === null ? memoryDisk() : null;
    this.#codeLeft = facts.code ?? null;
  }

  get recorded(): number {
    return this.#recorded;
  }

  /** Record a clip, and do what a device does between two clips. @throws PowerLost when the fleet is stopped */
  async round(): Promise<void> {
    await this.#alive((awake) => this.#record(awake));
    await this.settle();
  }

  /** Send what waits, without recording. @returns how many clips still wait, infinitely many when nobody can say */
  async settle(): Promise<number> {
    let waiting = Number.POSITIVE_INFINITY;
    await this.#alive(async (awake) => {
      await this.#beEnrolled(awake);
      await this.#beHeard(awake);
      waiting = await this.#send(awake);
    });
    return waiting;
  }

  #chance(...purpose: (string | number)[]): () => number {
    return chanceOf(this.#options.seed, this.#facts.serialNumber, ...purpose);
  }

  #tell(event: MemberEvent): void {
    this.#options.onEvent?.({ serialNumber: this.#facts.serialNumber, ...event } as FleetEvent);
  }

  readonly #rest = async (milliseconds: number): Promise<void> => {
    if (!this.#stopping.aborted) await (this.#options.sleep ?? sleepUntil(this.#stopping))(milliseconds);
    if (this.#stopping.aborted) throw new PowerLost('switched off');
  };

  async #wake(): Promise<Awake> {
    const { origin, stateFolder } = this.#options;
    const { serialNumber } = this.#facts;
    const send: typeof fetch = (input, init) =>
      (this.#options.fetch ?? fetch)(input, {
        ...init,
        signal: init?.signal ? AbortSignal.any([init.signal, this.#stopping]) : this.#stopping,
      });
    const life = beginLife(faultyFetch(send, this.#faults.network, this.#network, this.#rest), this.#rest);
    const disk =
      this.#memory ?? folderDisk(join(stateFolder ?? '', serialNumber.replace(/[^\w.-]/g, '_')), life.files);
    const device = await createDevice({
      origin,
      serialNumber,
      stateFolder: null,
      disk,
      clock: this.#clock,
      random: this.#retries,
      fetch: life.fetch,
      sleep: life.sleep,
    });
    this.#lives++;
    return { life, device, queue: await openQueue(disk) };
  }

  /** Do something in the present life; where the power goes, the next thing begins a new one. */
  async #alive(work: (awake: Awake) => Promise<void>): Promise<void> {
    try {
      this.#awake ??= await this.#wake();
      await work(this.#awake);
    } catch (error) {
      if (this.#stopping.aborted) throw new PowerLost('switched off');
      if (error instanceof PowerLost) {
        this.#awake = null;
        this.#tell({ kind: 'rebooted' });
      } else if (error instanceof ServiceProblem) {
        this.#noteRefusal(error);
        this.#tell({ kind: 'refused', recordingNumber: null, code: error.code });
      } else if (error instanceof NoAnswer) {
        this.#tell({ kind: 'trouble', why: error.message });
      } else throw error;
    }
  }

  /** A credential that is not accepted, and a code at hand: the device was brought back to the bench. */
  #noteRefusal(error: Error): void {
    if (error instanceof ServiceProblem && error.code === 'token-invalid')
      this.#mustEnrol = this.#codeLeft !== null;
  }

  async #beEnrolled({ device }: Awake): Promise<void> {
    if (device.credential && !this.#mustEnrol) return;
    if (this.#codeLeft === null) throw new NoAnswer('there is neither a credential nor a code');
    try {
      const answer = await enrol(device, this.#codeLeft, this.#facts.firmware);
      this.#tell({ kind: 'enrolled', assetTag: answer.assetTag });
    } catch (error) {
      // A refused code stays refused: asked again and again it would only count as guessing.
      if (error instanceof ServiceProblem && !isPassing(error)) this.#giveUpCode();
      throw error;
    }
    this.#giveUpCode();
  }

  #giveUpCode(): void {
    this.#codeLeft = null;
    this.#mustEnrol = false;
  }

  async #beHeard({ device, queue }: Awake): Promise<void> {
    const every = this.#options.heartbeatEveryMs ?? HEARTBEAT_EVERY_MS;
    if (this.#base.now() - this.#lastHeartbeat < every) return;
    const { firmware } = this.#facts;
    const queued = (await queue.list()).filter(isWaiting).length;
    const before = device.credential?.credentialId;
    await heartbeat(device, {
      batteryPercent: 40 + Math.floor(this.#chance('battery', this.#recorded)() * 60),
      queued,
      ...(firmware === undefined ? {} : { firmware }),
    });
    this.#lastHeartbeat = this.#base.now();
    this.#tellRenewal(device, before);
  }

  #tellRenewal(device: Device, before: string | undefined): void {
    const after = device.credential?.credentialId;
    if (after !== undefined && after !== before) this.#tell({ kind: 'renewed', credentialId: after });
  }

  async #record({ life, device, queue }: Awake): Promise<void> {
    const entries = await queue.list();
    if (entries.filter(isWaiting).length >= MOST_WAITING) return;
    // A device that lost its state counts from one again, under the name of its new key.
    const keyName = (await thumbprintOf(device.keys.publicJwk)).slice(0, 6);
    const taken = entries.map(({ recordingNumber }) => numberUnder(keyName, recordingNumber));
    const n = Math.max(0, ...taken) + 1;
    const { clocks, reboots } = this.#faults;
    const ill = this.#chance('ill', n, this.#lives);
    if (ill() < clocks.setWrongly) {
      this.#clock.offsetMs += Math.round((ill() - 0.5) * 4 * DAY_MS);
      this.#tell({ kind: 'clock-set', offsetMs: this.#clock.offsetMs });
    }
    if (ill() < reboots) life.dieAfter(1 + Math.floor(ill() * STEPS_OF_A_CLIP));
    const { clip, recipe } = recordClip(this.#options, this.#facts, this.#chance('clip', n), {
      recordingNumber: `${keyName}.${n}`,
      recordedAt: deviceTime(this.#clock.now()),
    });
    await queue.add(clip);
    this.#recorded++;
    this.#tell({ kind: 'recorded', recordingNumber: clip.recordingNumber, recipe });
  }

  async #send({ device, queue }: Awake): Promise<number> {
    const before = device.credential?.credentialId;
    const drained = await drainQueue(device, queue, (event) => this.#tellQueue(event), this.#stopping);
    this.#tellRenewal(device, before);
    if (drained.stopped) this.#noteRefusal(drained.stopped);
    return drained.waiting;
  }

  #tellQueue(event: QueueEvent): void {
    const recordingNumber = event.entry.recordingNumber ?? event.entry.place;
    if (event.kind === 'sent') this.#tell({ kind: 'sent', recordingNumber, answer: event.answer });
    else if (event.kind === 'refused')
      this.#tell({ kind: 'refused', recordingNumber, code: event.problem.code });
    else if (event.kind === 'damaged')
      this.#tell({ kind: 'trouble', why: `${recordingNumber} is damaged on the disk` });
    // What the loss of power keeps back is told as that.
    else if (!isPowerLoss(event.cause))
      this.#tell({ kind: 'trouble', why: `${recordingNumber} waits: ${event.cause.message}` });
  }
}

const isPowerLoss = (error: Error): boolean => error.cause instanceof PowerLost;

/** The count in a recording number that was made under this key; 0 when it is another's. */
function numberUnder(keyName: string, recordingNumber: string | null): number {
  const [name, count] = recordingNumber?.split('.') ?? [];
  return name === keyName ? Number(count) : 0;
}

function firstClock(random: () => number, yearsOff: number, base: DeviceClock): SettableClock {
  const wrong = random() < yearsOff;
  const much = (random() - 0.5) * 2;
  return settableClock(Math.round(wrong ? much * 10 * 365 * DAY_MS : much * 4000), base);
}

function recordClip(
  options: FleetOptions,
  facts: FleetDevice,
  random: () => number,
  stamp: { recordingNumber: string; recordedAt: number },
): { clip: Clip; recipe: string } {
  const seed = Math.floor(random() * 2 ** 31);
  const recipe = usualRecipe(random);
  const sound = recipeOf(recipe, seed, facts.sampleRateHz ?? 4000, options.clipSeconds);
  const clip: Clip = {
    ...stamp,
    bytes: encodeWav([synthesise(sound, seed)], {
      sampleRateHz: sound.faults.declaredRateHz ?? sound.sampleRateHz,
      bitDepth: 16,
    }),
    mediaType: 'audio/wav',
    site: SITE_IDS[Math.floor(random() * SITE_IDS.length)] ?? SITE_IDS[0],
    chestpieceSide: random() < 0.7 ? 'diaphragm' : 'bell',
    gainStep: Math.floor(random() * 5) - 2,
  };
  return { clip, recipe };
}

/** A sleep that ends when the fleet is stopped. */
export const sleepUntil = (signal: AbortSignal) => (milliseconds: number) =>
  new Promise<void>((resolve) => {
    const end = () => {
      clearTimeout(timer);
      signal.removeEventListener('abort', end);
      resolve();
    };
    const timer = setTimeout(end, milliseconds);
    signal.addEventListener('abort', end);
  });
