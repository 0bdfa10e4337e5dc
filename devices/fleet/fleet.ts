import { join } from 'node:path';
import { SITE_IDS } from '@/lib/contract/sites';
import { ServiceProblem } from '../agent/api';
import { clockWithOffset } from '../agent/clock';
import { createDevice, type Device } from '../agent/device';
import { enrol, renew } from '../agent/enrol';
import { heartbeat } from '../agent/heartbeat';
import { sendRecording } from '../agent/upload';
import { synthesise } from '../synth/chest';
import { seeded } from '../synth/noise';
import { recipeOf, usualRecipe } from '../synth/recipes';
import { encodeWav } from '../synth/wav';

export interface FleetDevice {
  serialNumber: string;
  /** One-time code; null when its state folder holds a credential already. */
  code: string | null;
  sampleRateHz: number;
  firmware: string;
}

export interface FleetOptions {
  origin: string;
  devices: FleetDevice[];
  seed: number;
  /** Clips a minute over the whole fleet. */
  pace: number;
  stateFolder: string;
  onEvent(text: string): void;
}

const HEARTBEAT_EVERY_MS = 60_000;
const MINUTE_MS = 60_000;

interface Member {
  device: Device;
  facts: FleetDevice;
  random: () => number;
  lastHeartbeat: number;
  sent: number;
}

/** Wake one device of the fleet: its clock is a little wrong, and one in twelve is years off. */
async function wake(options: FleetOptions, facts: FleetDevice, index: number): Promise<Member> {
  const random = seeded(options.seed * 7919 + index);
  const offset = index % 12 === 11 ? -3 * 365 * 86_400_000 : Math.round((random() - 0.5) * 8000);
  const device = await createDevice({
    origin: options.origin,
    serialNumber: facts.serialNumber,
    stateFolder: join(options.stateFolder, facts.serialNumber.replace(/[^\w.-]/g, '_')),
    clock: clockWithOffset(offset),
    random,
  });
  if (!device.credential) {
    if (facts.code === null) throw new Error(`${facts.serialNumber} has neither a credential nor a code`);
    await enrol(device, facts.code, facts.firmware);
    options.onEvent(`${facts.serialNumber} enrolled`);
  }
  return { device, facts, random, lastHeartbeat: 0, sent: 0 };
}

async function record(options: FleetOptions, member: Member): Promise<void> {
  const { device, facts, random } = member;
  const seed = Math.floor(random() * 2 ** 31);
  const recipe = recipeOf(usualRecipe(random), seed, facts.sampleRateHz);
  const recordedAt = device.clock.now();
  const bytes = encodeWav([synthesise(recipe, seed)], { sampleRateHz: facts.sampleRateHz, bitDepth: 16 });
  const { answer } = await sendRecording(device, {
    recordingNumber: `R${recordedAt.toString(36)}-${member.sent++}`,
    bytes,
    mediaType: 'audio/wav',
    recordedAt,
    site: SITE_IDS[Math.floor(random() * SITE_IDS.length)] ?? SITE_IDS[0],
    chestpieceSide: random() < 0.7 ? 'diaphragm' : 'bell',
    gainStep: Math.floor(random() * 5) - 2,
  });
  options.onEvent(`${facts.serialNumber} sent ${answer.recording}: ${answer.verdict}`);
  if (answer.renew) await renew(device);
}

/**
 * A fleet that keeps uploading until it is told to stop. A device that is refused (taken out of service, revoked)
 * waits and tries again later, as a real one on a shelf does.
 */
export async function runFleet(options: FleetOptions, signal: AbortSignal): Promise<void> {
  const members: Member[] = [];
  for (const [i, facts] of options.devices.entries()) {
    try {
      members.push(await wake(options, facts, i));
    } catch (error) {
      options.onEvent(
        `${facts.serialNumber} could not be woken: ${error instanceof Error ? error.message : error}`,
      );
    }
  }
  const random = seeded(options.seed);
  const wait = (milliseconds: number) =>
    new Promise<void>((resolve) => {
      const timer = setTimeout(resolve, milliseconds);
      signal.addEventListener(
        'abort',
        () => {
          clearTimeout(timer);
          resolve();
        },
        { once: true },
      );
    });
  while (!signal.aborted && members.length > 0) {
    const member = members[Math.floor(random() * members.length)] as Member;
    try {
      if (Date.now() - member.lastHeartbeat > HEARTBEAT_EVERY_MS) {
        member.lastHeartbeat = Date.now();
        await heartbeat(member.device, {
          batteryPercent: 40 + Math.floor(member.random() * 60),
          firmware: member.facts.firmware,
          queued: 0,
        });
      }
      await record(options, member);
    } catch (error) {
      options.onEvent(
        `${member.facts.serialNumber}: ${error instanceof ServiceProblem ? error.code : error instanceof Error ? error.message : error}`,
      );
    }
    await wait((MINUTE_MS / options.pace) * (0.5 + random()));
  }
}
