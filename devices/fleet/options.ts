import type { FleetEvent } from './events';
import { CALM, type NetworkFaults } from './network';

export interface FleetDevice {
  serialNumber: string;
  /** One-time code; null or absent when its state folder holds a credential already. */
  code?: string | null | undefined;
  /** What its model records at (4000). */
  sampleRateHz?: number | undefined;
  firmware?: string | undefined;
}

export interface FleetFaults {
  network: NetworkFaults;
  /** Share of devices whose clock is years off, and share of clips before which somebody sets a clock wrongly. */
  clocks: { yearsOff: number; setWrongly: number };
  /** Share of clips in the midst of which the power goes. */
  reboots: number;
}

export const FAULTS = {
  none: { network: CALM, clocks: { yearsOff: 0, setWrongly: 0 }, reboots: 0 },
  usual: {
    network: {
      lostRequest: 0.01,
      lostAnswer: 0.01,
      slow: { share: 0.05, longestMs: 2000 },
      cutUpload: 0.01,
    },
    clocks: { yearsOff: 1 / 12, setWrongly: 0.005 },
    reboots: 0.02,
  },
  harsh: {
    network: {
      lostRequest: 0.1,
      lostAnswer: 0.15,
      slow: { share: 0.2, longestMs: 5000 },
      cutUpload: 0.15,
    },
    clocks: { yearsOff: 0.25, setWrongly: 0.1 },
    reboots: 0.4,
  },
} satisfies Record<string, FleetFaults>;

export interface FleetOptions {
  /** Address of the service, without a trailing slash. */
  origin: string;
  devices: FleetDevice[];
  /** The same seed gives the same sounds, clocks and faults. */
  seed: number;
  /** Clips a minute over the whole fleet. */
  pace: number;
  /** Each device records so many clips and ends when they are sent; without it the fleet runs until it is stopped. */
  clipsEach?: number;
  /** Asked after `clipsEach`: while it says no, devices go on recording; each ends with nothing left to send. */
  enough?(): boolean;
  /** Seconds of sound a clip; the recipes' own length without it. */
  clipSeconds?: number;
  faults?: FleetFaults;
  /** Where devices keep keys, credentials and queues; null: in memory, and a fleet started again must enrol again. */
  stateFolder: string | null;
  onEvent?(event: FleetEvent): void;
  clock?: { now(): number };
  sleep?(milliseconds: number): Promise<void>;
  fetch?: typeof fetch;
  heartbeatEveryMs?: number;
}
